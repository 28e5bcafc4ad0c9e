import { FLAG } from '@wakeloom/tracker/core/columns';
import type { FitParameters } from '@wakeloom/tracker/kinematics/fit-parameters';
import { fitWindow } from '@wakeloom/tracker/kinematics/fit-window';
import { describe, expect, it } from 'vitest';
import { type LinkedPoint, linkedBlock } from '../helpers/linked.js';

const base: FitParameters = {
  noise: [0.01, 0.01, 0.03],
  span: 7,
  order: 2,
  bridge: 2,
  interval: 1,
  pairs: false,
  riskLimit: 0.5,
  medianThreshold: 2,
  medianNeighbours: 8,
  medianEpsilon: null,
  offFitLimit: 5,
  bodies: [],
  rim: 0,
};

function fitAll(points: readonly LinkedPoint[], change: Partial<FitParameters> = {}, dims: 2 | 3 = 2) {
  const interval = change.interval === undefined ? base.interval : change.interval;
  const block = linkedBlock(points, { dims, timeOf: (frame) => frame * (interval ?? 1) });
  return fitWindow(block, { from: 0, to: block.number.length }, { ...base, ...change });
}

const has = (flags: number | undefined, name: keyof typeof FLAG) => ((flags ?? 0) & FLAG[name]) !== 0;

describe('fit of a window', () => {
  it('uniform shear: every sample exact, ends and gaps included', () => {
    // u = 0.4 y: straight pathlines at constant speed.
    const points: LinkedPoint[] = [];
    for (let frame = 0; frame < 25; frame++) {
      for (let p = 0; p < 12; p++) {
        if ((frame + p) % 6 === 5) continue;
        const y = p - 5.5;
        points.push({ frame, pathline: p, x: 10 + 0.4 * y * frame * 0.02, y });
      }
    }
    const samples = fitAll(points, { interval: 0.02 });
    expect(samples.x.length).toBe(points.length);
    for (let s = 0; s < samples.x.length; s++) {
      const y = samples.pathline[s]! - 5.5;
      const frame = points[samples.detection[s]!]!.frame;
      expect(Math.abs(samples.x[s]! - (10 + 0.4 * y * frame * 0.02))).toBeLessThan(1e-9 * 10);
      expect(Math.abs(samples.y[s]! - y)).toBeLessThan(1e-9 * 10);
      // Velocities are kept in single precision.
      expect(samples.u[s]).toBeCloseTo(Math.fround(0.4 * y), 6);
      expect(Math.abs(samples.ax[s]!)).toBeLessThan(1e-9 * 1e3);
    }
  });

  it('a constant acceleration is exact at both ends, and its standard errors are noise times root of gain', () => {
    const points: LinkedPoint[] = [];
    for (let frame = 0; frame < 20; frame++) {
      points.push({ frame, pathline: 3, x: 2 + 0.5 * frame + 0.1 * frame * frame, y: -frame, z: 0.25 * frame * frame });
    }
    const samples = fitAll(points, {}, 3);
    for (let s = 0; s < 20; s++) {
      expect(samples.x[s]).toBeCloseTo(points[s]!.x, 10);
      expect(samples.u[s]).toBeCloseTo(0.5 + 0.2 * s, 5);
      expect(samples.ax[s]).toBeCloseTo(0.2, 6);
      expect(samples.w[s]).toBeCloseTo(0.5 * s, 5);
      expect(samples.az[s]).toBeCloseTo(0.5, 6);
    }
    // 7-point quadratic at the middle: gains 1/3, 1/28, 1/21 (Savitzky & Golay 1964).
    expect(samples.xSe[10]).toBeCloseTo(0.01 * Math.sqrt(1 / 3), 8);
    expect(samples.uSe[10]).toBeCloseTo(0.01 * Math.sqrt(1 / 28), 8);
    expect(samples.axSe[10]).toBeCloseTo(0.01 * Math.sqrt(1 / 21), 8);
    expect(samples.wSe[10]).toBeCloseTo(0.03 * Math.sqrt(1 / 28), 8);
    expect(samples.uSe[0]!).toBeGreaterThan(2 * samples.uSe[10]!);
  });

  it('near-end where the fit is one-sided, bridged where a missing frame lies within it', () => {
    const points: LinkedPoint[] = [];
    for (let frame = 0; frame < 30; frame++) if (frame !== 15) points.push({ frame, pathline: 0, x: frame, y: 0 });
    const samples = fitAll(points);
    const frames = points.map((point) => point.frame);
    for (const [s, frame] of frames.entries()) {
      expect(has(samples.flags[s], 'near-end')).toBe(frame < 3 || frame > 26);
      // The window of frames 12 .. 18 holds frame 15; at 12 and 18 it lies at the border, where nothing is crossed.
      expect(has(samples.flags[s], 'bridged')).toBe(frame > 12 && frame < 18);
    }
  });

  it('few samples: degree lowered, acceleration NaN, a lone sample without velocity', () => {
    const samples = fitAll([
      { frame: 0, pathline: 0, x: 0, y: 0 },
      { frame: 0, pathline: 1, x: 5, y: 5 },
      { frame: 1, pathline: 0, x: 2, y: 1 },
    ]);
    expect(Array.from(samples.u)).toEqual([2, Number.NaN, 2]);
    expect(Array.from(samples.v)).toEqual([1, Number.NaN, 1]);
    expect(Array.from(samples.ax)).toEqual([Number.NaN, Number.NaN, Number.NaN]);
    expect(samples.x[1]).toBe(5);
  });

  it('a displaced position is off its fit, alone, and its neighbours are fitted without it', () => {
    const points: LinkedPoint[] = [];
    for (let frame = 0; frame < 30; frame++) {
      points.push({ frame, pathline: 0, x: frame + (frame === 14 ? 0.5 : 0), y: 0.02 * frame * frame });
    }
    const samples = fitAll(points);
    const off = Array.from(samples.flags, (flags, s) => (has(flags, 'off-fit') ? s : -1)).filter((s) => s >= 0);
    expect(off).toEqual([14]);
    for (let s = 0; s < 30; s++) {
      expect(samples.x[s]).toBeCloseTo(s, 9);
      expect(samples.u[s]).toBeCloseTo(1, 5);
    }
    expect(samples.measuredX[14]).toBe(14.5);
  });

  it('a motion too quick for the span is not taken for outliers', () => {
    const points: LinkedPoint[] = [];
    for (let frame = 0; frame < 60; frame++) {
      points.push({ frame, pathline: 0, x: 5 * Math.cos(0.5 * frame), y: 5 * Math.sin(0.5 * frame) });
    }
    const samples = fitAll(points, { span: 9 });
    // The 9-point quadratic misses this circle by 0.25, 25 noise standard deviations, all along.
    expect(Math.hypot(samples.x[30]!, samples.y[30]!)).toBeLessThan(4.8);
    const inside = samples.flags.slice(9, 51).filter((flags) => has(flags, 'off-fit'));
    expect(inside.length).toBe(0);
  });

  it('doubtful-link on both samples of a link with a high risk', () => {
    const points = Array.from({ length: 9 }, (_, frame) => ({
      frame,
      pathline: 0,
      x: frame,
      y: 0,
      risk: frame === 4 ? 0.6 : 0.1,
    }));
    const flags = fitAll(points).flags;
    expect(Array.from(flags, (one) => has(one, 'doubtful-link'))).toEqual(
      [0, 1, 2, 3, 4, 5, 6, 7, 8].map((s) => s === 3 || s === 4),
    );
  });

  it('at-body within the rim of a circle and of a polygon', () => {
    const points: LinkedPoint[] = [];
    for (let frame = 0; frame < 5; frame++) {
      points.push({ frame, pathline: 0, x: 2.4, y: 0 }, { frame, pathline: 1, x: 2.6, y: 0 });
      points.push({ frame, pathline: 2, x: 9.6, y: 0.5 }, { frame, pathline: 3, x: 9.4, y: 0.5 });
    }
    const square = [
      [10, 0],
      [11, 0],
      [11, 1],
      [10, 1],
    ] as const;
    const samples = fitAll(points, {
      bodies: [
        { kind: 'circle', centre: [0, 0], diameter: 4 },
        { kind: 'polygon', points: square },
      ],
      rim: 0.5,
    });
    expect(Array.from(samples.flags.slice(0, 4), (flags) => has(flags, 'at-body'))).toEqual([true, false, true, false]);
  });

  it('a pathline against a uniform stream fails the median test and leaves its neighbours alone', () => {
    const points: LinkedPoint[] = [];
    for (let frame = 0; frame < 20; frame++) {
      for (let p = 0; p < 36; p++) {
        const [x, y] = [p % 6, Math.floor(p / 6)];
        const speed = p === 14 ? -0.05 : 0.05;
        points.push({ frame, pathline: p, x: x + speed * frame + 0.001 * ((p * 7 + frame * 13) % 10), y });
      }
    }
    const samples = fitAll(points);
    for (let s = 0; s < samples.flags.length; s++) {
      expect(has(samples.flags[s], 'off-neighbours')).toBe(samples.pathline[s] === 14);
    }
  });

  it('a detection without pathline gives no sample', () => {
    const samples = fitAll([
      { frame: 0, pathline: 7, x: 0, y: 0 },
      { frame: 0, pathline: -1, x: 1, y: 1 },
      { frame: 1, pathline: 7, x: 1, y: 0 },
    ]);
    expect(Array.from(samples.detection)).toEqual([0, 2]);
    expect(Array.from(samples.offsets)).toEqual([0, 1, 2]);
  });
});

describe('image pairs', () => {
  const pairs = (count: number, core = { from: 0, to: 2 * count }) => {
    const points: LinkedPoint[] = [];
    for (let pair = 0; pair < count; pair++) {
      for (let p = 0; p < 30; p++) {
        const [x, y] = [p % 6, Math.floor(p / 6)];
        const wrong = pair === 1 && p === 8 ? 0.5 : 0;
        points.push({ frame: 2 * pair, pathline: 100 * pair + p, x, y });
        points.push({ frame: 2 * pair + 1, pathline: 100 * pair + p, x: x + 0.1 + wrong, y: y + 0.02, risk: 0.2 });
      }
      points.push({ frame: 2 * pair, pathline: -1, x: 50, y: 50 });
    }
    const block = linkedBlock(points, {
      timeOf: (frame) => Math.floor(frame / 2) + (frame % 2) * 0.01,
      segmentOf: (frame) => Math.floor(frame / 2),
    });
    return fitWindow(block, core, { ...base, pairs: true, noise: [0.005, 0.005, Number.NaN] });
  };

  it('one sample a linked pair at mid-point and mid-time, without acceleration', () => {
    const samples = pairs(3);
    expect(Array.from(samples.number)).toEqual([0, 2, 4]);
    expect(Array.from(samples.time)).toEqual([0.005, 1.005, 2.005]);
    expect(samples.x.length).toBe(90);
    expect(samples.x[0]).toBeCloseTo(0.05, 12);
    expect(samples.y[0]).toBeCloseTo(0.01, 12);
    expect(samples.u[0]).toBeCloseTo(10, 5);
    expect(samples.v[0]).toBeCloseTo(2, 5);
    expect(samples.uSe[0]).toBeCloseTo((0.005 * Math.SQRT2) / 0.01, 6);
    expect(samples.xSe[0]).toBeCloseTo(0.005 * Math.SQRT1_2, 8);
    expect(samples.ax[0]).toBeNaN();
    expect(samples.linkRisk[0]).toBeCloseTo(0.2, 6);
  });

  it('screens within the pair', () => {
    const samples = pairs(3);
    const bad = Array.from(samples.flags, (flags, s) => (has(flags, 'off-neighbours') ? samples.pathline[s] : -1));
    expect(bad.filter((p) => p !== -1)).toEqual([108]);
  });

  it('a cut between the two frames of a pair loses and doubles nothing', () => {
    const whole = pairs(3);
    const first = pairs(3, { from: 0, to: 3 });
    const second = pairs(3, { from: 3, to: 6 });
    expect([...first.number, ...second.number]).toEqual(Array.from(whole.number));
    expect([...first.u, ...second.u]).toEqual(Array.from(whole.u));
    expect([...first.flags, ...second.flags]).toEqual(Array.from(whole.flags));
  });
});
