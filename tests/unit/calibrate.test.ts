import { createContext } from '@wakeloom/tracker';
import { bodyDistance, calibrate, calibrationSummary, newTally } from '@wakeloom/tracker/detections/calibrate';
import { describe, expect, it } from 'vitest';
import { controlPoints, gridPoints, HOMOGRAPHY, POLYNOMIAL } from '../helpers/control-points.js';
import { blockOf, calibrated, randomBlock, scaleGeometry, scanOf, settingsWith } from '../helpers/detections.js';

const by = (value: number, standardUncertainty: number | null = 0) => ({ value, unit: 'mm/px', standardUncertainty });
const rate = { kind: 'rate', rate: { value: 4, unit: 'Hz', standardUncertainty: 0 } } as const;
const region = { x: [0, 10], y: [0, 10], z: null } as const;

describe('calibration', () => {
  it('maps, times and orders what it is given', async () => {
    const geometry = scaleGeometry({ scale: by(0.5), origin: [2, 4, 0], yAxis: 'down' });
    const { block, tally, events } = await calibrated(
      settingsWith({ clock: rate, geometry }),
      blockOf([4, 2], [6, 10], [2, 4]),
    );
    expect([...block.y]).toEqual([-3, 0, 1]);
    expect([...block.x]).toEqual([2, 0, 1]);
    expect([...block.row]).toEqual([1, 2, 0]);
    expect([...block.time]).toEqual([0]);
    expect([...block.segment]).toEqual([0]);
    expect(tally).toEqual({ detections: 3, outsideRegion: 0, insideBody: 0, outsideHull: 0 });
    expect(events).toEqual([]);
  });

  it('counts what region and body leave out, border and surface kept', async () => {
    const body = [{ kind: 'circle', centre: [5, 5], diameter: 4 }] as const;
    const { block, tally } = await calibrated(
      settingsWith({ geometry: scaleGeometry({ region }), body }),
      blockOf([0, 0], [10, 10], [10.001, 5], [5, -1], [5, 5], [6.5, 5], [7, 5], [20, 20]),
    );
    expect([...block.row]).toEqual([0, 6, 1]);
    expect(tally).toEqual({ detections: 8, outsideRegion: 3, insideBody: 2, outsideHull: 0 });
    expect([...block.offsets]).toEqual([0, 3]);
    expect(block.x.length).toBe(3);
    expect(block.row.length).toBe(3);
  });

  it('keeps columns together and frames apart when rows are left out', async () => {
    const whole = randomBlock(3, [200, 0, 300, 50], 31, 7);
    const body = [{ kind: 'circle', centre: [500, 400], diameter: 300 }] as const;
    const box = { x: null, y: [100, 900], z: [20, 250] } as const;
    const { block, tally } = await calibrated(
      settingsWith({ geometry: scaleGeometry({ region: box }), body, clock: rate }),
      whole,
    );
    let kept = 0;
    for (let k = 0; k < whole.number.length; k++) {
      const expected: number[] = [];
      for (let i = whole.offsets[k]!; i < whole.offsets[k + 1]!; i++) {
        const within = whole.y[i]! >= 100 && whole.z[i]! >= 20 && whole.z[i]! <= 250;
        if (within && bodyDistance(body[0], whole.x[i]!, whole.y[i]!) >= 0) expected.push(i);
      }
      kept += expected.length;
      const rows = [...block.row.subarray(block.offsets[k]!, block.offsets[k + 1]!)];
      expect(rows.sort((a, b) => a - b)).toEqual(expected);
    }
    expect(kept).toBeGreaterThan(200);
    expect(kept).toBeLessThan(500);
    expect(tally.detections - tally.outsideRegion - tally.insideBody).toBe(kept);
    expect(tally.insideBody).toBeGreaterThan(10);
    for (const column of [block.x, block.y, block.z, block.brightness, block.given]) expect(column.length).toBe(kept);
    for (let i = 0; i < kept; i++) {
      const from = block.row[i]!;
      expect([block.x[i], block.y[i], block.z[i], block.brightness[i], block.given[i]]).toEqual([
        whole.x[from],
        whole.y[from],
        whole.z[from],
        whole.brightness[from],
        whole.given[from],
      ]);
    }
    expect([...block.time]).toEqual([0, 0.25, 0.5, 0.75]);
  });

  it('counts positions that overflow as outside the region instead of passing them on', async () => {
    const { block, tally } = await calibrated(
      settingsWith({ geometry: scaleGeometry({ scale: by(1e10) }) }),
      blockOf([1e305, 0], [0, -1e305], [1, 1]),
    );
    expect([...block.row]).toEqual([2]);
    expect(tally.outsideRegion).toBe(2);
  });

  it('carries the clock from block to block, counted from the first frame of the scan', async () => {
    const blocks = [10, 13, 15].map((frame) => randomBlock(2, [3, 2], frame, frame));
    const clock = {
      kind: 'pairs',
      rate: { value: 4, unit: 'Hz', standardUncertainty: 0 },
      delay: { value: 0.01, unit: 's', standardUncertainty: 0 },
    } as const;
    const { blocks: out } = await calibrated(settingsWith({ clock }), ...blocks);
    expect(out.flatMap((block) => [...block.segment])).toEqual([0, 0, 1, 2, 2, 3]);
    expect(out.flatMap((block) => [...block.time])).toEqual([0, 0.01, 0.26, 0.5, 0.51, 0.75]);
  });

  it('finds times that fall back between blocks', async () => {
    const one = { ...randomBlock(2, [1, 1], 1, 0), time: Float64Array.of(0.1, 0.2) };
    const two = { ...randomBlock(2, [1, 1], 1, 2), time: Float64Array.of(0.15, 0.3) };
    await expect(calibrated(settingsWith({ clock: { kind: 'times' } }), one, two)).rejects.toMatchObject({
      code: 'dump/time-not-ascending',
      details: { frame: 2, frameBefore: 1 },
    });
  });

  it('maps by control points, counts extrapolated detections and warns once', async () => {
    const geometry = controlPoints('projective', gridPoints(5, 5), HOMOGRAPHY);
    const { block, tally, events } = await calibrated(
      settingsWith({ geometry }),
      blockOf([500, 400], [1000, 800], [1000.5, 400], [500, -3]),
      blockOf([0, 0], [-1, -1]),
    );
    for (let i = 0; i < 4; i++) {
      const from = [
        [500, 400],
        [1000, 800],
        [1000.5, 400],
        [500, -3],
      ][block.row[i]!]!;
      const [u, v] = HOMOGRAPHY(from[0]!, from[1]!);
      expect(block.x[i]).toBeCloseTo(u, 10);
      expect(block.y[i]).toBeCloseTo(v, 10);
    }
    expect(tally).toEqual({ detections: 6, outsideRegion: 0, insideBody: 0, outsideHull: 3 });
    expect(events.map((event) => [event.code, event.level])).toEqual([['geometry/outside-hull', 'warning']]);
    expect(events[0]!.details).toEqual({ outsideHull: 3, kept: 6 });
    expect(events[0]!.message).toContain('3 of 6 detections (50.00 %)');
  });

  it('refuses control points for a volume', async () => {
    const geometry = controlPoints('affine', gridPoints(3, 3), POLYNOMIAL.affine);
    await expect(calibrated(settingsWith({ geometry }), randomBlock(3, [4], 1))).rejects.toMatchObject({
      code: 'geometry/control-points-planar',
    });
  });

  it('says when turning y may have mirrored a volume', async () => {
    const down = settingsWith({ geometry: scaleGeometry({ yAxis: 'down' }) });
    const volume = await calibrated(down, randomBlock(3, [4], 1));
    expect(volume.events.map((event) => event.code)).toEqual(['geometry/handedness']);
    expect((await calibrated(down, randomBlock(2, [4], 1))).events).toEqual([]);
    const reversed = settingsWith({ geometry: scaleGeometry({ yAxis: 'down', scaleZ: by(-1) }) });
    expect((await calibrated(reversed, randomBlock(3, [4], 1))).events).toEqual([]);
  });

  it('checks settings before it takes a block', async () => {
    let taken = 0;
    async function* source() {
      taken++;
      yield blockOf([0, 0]);
    }
    const settings = settingsWith({ body: [{ kind: 'circle', centre: [0, 0], diameter: -1 }] });
    const input = { settings, scan: scanOf(blockOf([0, 0])), context: createContext(), tally: newTally() };
    await expect(calibrate(input, source()).next()).rejects.toMatchObject({ code: 'geometry/body' });
    expect(taken).toBe(0);
  });

  it('stops when the run is aborted', async () => {
    const controller = new AbortController();
    controller.abort();
    async function* source() {
      yield blockOf([0, 0]);
    }
    const context = createContext({ signal: controller.signal });
    const input = { settings: settingsWith({}), scan: scanOf(blockOf([0, 0])), context, tally: newTally() };
    await expect(calibrate(input, source()).next()).rejects.toMatchObject({ code: 'run/aborted' });
  });
});

describe('calibration summary', () => {
  it('lists what is stated of scale, origin, angle and rate', () => {
    const geometry = scaleGeometry({
      scale: by(0.05, 0.0002),
      originUncertainty: 0.5,
      rotation: { value: 1, unit: 'deg', standardUncertainty: 0.1 },
    });
    const clock = { kind: 'rate', rate: { value: 60, unit: 'Hz', standardUncertainty: 0.012 } } as const;
    const { systematic, remarks, map } = calibrationSummary(settingsWith({ geometry, clock }));
    expect(map).toBeNull();
    expect(remarks).toEqual([]);
    expect(systematic.map(({ source, unit }) => [source, unit])).toEqual([
      ['scale', '1'],
      ['origin', settingsWith({}).units.length],
      ['angle', 'deg'],
      ['rate', '1'],
    ]);
    const values = systematic.map((line) => line.standardUncertainty);
    expect(values[0]).toBeCloseTo(0.004, 15);
    expect(values[1]).toBeCloseTo(0.025, 15);
    expect(values[2]).toBe(0.1);
    expect(values[3]).toBeCloseTo(0.0002, 15);
  });

  it('remarks on what is not known and is silent about what is exact', () => {
    const unknown = calibrationSummary(settingsWith({ geometry: scaleGeometry({ scale: by(0.05, null) }) }));
    expect(unknown.systematic).toEqual([]);
    expect(unknown.remarks).toEqual([expect.stringContaining('scale (0.05 mm/px)')]);
    expect(calibrationSummary(settingsWith({ geometry: scaleGeometry({}) }))).toMatchObject({
      systematic: [],
      remarks: [],
    });
    const delay = { value: 0.01, unit: 's', standardUncertainty: 0.0001 };
    const pairs = { kind: 'pairs', rate: { ...rate.rate, standardUncertainty: null }, delay } as const;
    const { systematic } = calibrationSummary(settingsWith({ clock: pairs }));
    expect(systematic.map((line) => [line.source, line.standardUncertainty])).toEqual([['delay of image pairs', 0.01]]);
  });

  it('gives residuals, hull and the uncertainty of a fitted map', () => {
    const geometry = controlPoints('polynomial-2', gridPoints(6, 5), POLYNOMIAL['polynomial-2'], 0.02, 2);
    const { map, systematic, remarks } = calibrationSummary(settingsWith({ geometry }));
    expect(map).toMatchObject({ map: 'polynomial-2', points: 30 });
    expect([...map!.hull]).toEqual([0, 0, 1000, 0, 1000, 800, 0, 800]);
    expect(systematic).toEqual([expect.objectContaining({ standardUncertainty: map!.rms })]);
    // Leaving a point out can only enlarge its residual in a linear fit.
    for (let i = 0; i < 30; i++) {
      expect(Math.abs(map!.leaveOneOutX[i]!)).toBeGreaterThan(Math.abs(map!.residualX[i]!));
    }
    expect(map!.leaveOneOutRms).toBeGreaterThan(map!.rms);
    expect(remarks).toEqual([]);
  });

  it('names the control point that fits badly', () => {
    const clean = controlPoints('affine', gridPoints(5, 4), POLYNOMIAL.affine, 0.01, 2);
    const points = clean.points.map((p, i) => (i === 6 ? ([p[0], p[1], p[2] + 1, p[3]] as const) : p));
    const { remarks } = calibrationSummary(settingsWith({ geometry: { ...clean, points } }));
    // 1 mm off, give or take the noise of the points.
    expect(remarks).toEqual([expect.stringMatching(/^Control point 7 lies (0\.9[5-9]|1\.0[0-5])\d* \S+ off/)]);
  });

  it('says that just enough points leave the uncertainty unknown, and which point nothing checks', () => {
    const just = controlPoints(
      'affine',
      [
        [0, 0],
        [10, 0],
        [0, 10],
      ],
      POLYNOMIAL.affine,
    );
    const summary = calibrationSummary(settingsWith({ geometry: just }));
    expect(summary.systematic).toEqual([]);
    expect(summary.remarks).toEqual([expect.stringContaining('just enough')]);
    // Five points on a line and one beside it: without that one there is no map.
    const line: [number, number][] = [0, 1, 2, 3, 4].map((k) => [100 * k, 50 * k]);
    const beside = controlPoints('affine', [...line, [300, 700]], POLYNOMIAL.affine, 0.01);
    expect(calibrationSummary(settingsWith({ geometry: beside })).remarks[0]).toContain('Without control point 6');
  });
});
