import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { taylorGreen } from '@wakeloom/tracker/synthesis/flows-cellular';
import { afterAll, describe, expect, it } from 'vitest';
import { runCli } from '../helpers/run-cli';
import { type TruthDump, truthDump } from '../helpers/truth';

const folder = mkdtempSync(join(tmpdir(), 'wakeloom-clocks-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));

const SCALE = 0.05;
const flow = taylorGreen(30, (2 * Math.PI) / 24);

/** Detections of a box of 40 x 30 mm in the cellular flow, in mm; truth by separate code. */
function recording(frames: number, rate: number, seed: number, startTime = 0): TruthDump {
  return truthDump({
    flow,
    frames,
    rate,
    perFrame: 700,
    box: [
      [0, 40],
      [0, 30],
    ],
    lossShare: 0.04,
    ghostShare: 0.04,
    noise: 0.005,
    steps: 4,
    seed,
    startTime,
  });
}

interface Rows {
  readonly line: string[];
  readonly particle: number[];
}

/** Appends frames of a recording as CSV lines, with the truth of each data row. */
function append(
  rows: Rows,
  dump: TruthDump,
  frameOf: (k: number) => number,
  extra: (row: number, k: number) => string,
) {
  for (let row = 0; row < dump.x.length; row++) {
    const k = dump.frame[row];
    rows.line.push(`${frameOf(k)},${dump.x[row] / SCALE},${dump.y[row] / SCALE}${extra(row, k)}`);
    rows.particle.push(dump.particle[row]);
  }
}

async function processed(name: string, header: string, rows: Rows, options: string[]) {
  const dump = join(folder, `${name}.csv`);
  const out = join(folder, name);
  writeFileSync(dump, `${header}\n${rows.line.join('\n')}\n`);
  const done = await runCli(['process', dump, '--scale', `${SCALE} mm/px`, '--bin', '4 mm', '--out', out, ...options]);
  expect(done.stderr).not.toMatch(/^error/m);
  expect(done.code).toBe(0);
  const exported = join(folder, `${name}-pathlines.csv`);
  expect((await runCli(['export', out, 'pathlines', '--format', 'csv', '--out', exported])).code).toBe(0);
  const [head, ...lines] = readFileSync(exported, 'utf8').trim().split('\n');
  const names = head.split(',');
  const samples = lines.map((line) => {
    const cells = line.split(',');
    return Object.fromEntries(names.map((column, i) => [column, cells[i] === '' ? Number.NaN : Number(cells[i])]));
  });
  return { samples, names, record: JSON.parse(readFileSync(join(out, 'run.json'), 'utf8')) };
}

/** Root mean square of u and v against the flow at the place of the sample, over unflagged samples of true particles. */
function velocityError(samples: Record<string, number>[], rows: Rows): { rms: number; count: number; stated: number } {
  const truth = new Float64Array(3);
  let sum = 0;
  let stated = 0;
  let count = 0;
  for (const sample of samples) {
    if (rows.particle[sample['detection']] < 0 || (sample['flags'] & ~6) !== 0) continue;
    flow.velocity(sample['x'], sample['y'], 0, 0, truth);
    const du = sample['u'] - truth[0];
    const dv = sample['v'] - truth[1];
    sum += du * du + dv * dv;
    stated += sample['u_se'] ** 2 + sample['v_se'] ** 2;
    count += 2;
  }
  return { rms: Math.sqrt(sum / count), count, stated: Math.sqrt(stated / count) };
}

describe('image pairs', () => {
  it('give one velocity at the mid-point and mid-time, without acceleration, noise from neighbours', async () => {
    const delay = 0.012;
    const rows: Rows = { line: [], particle: [] };
    const pairs = 24;
    for (let p = 0; p < pairs; p++)
      append(
        rows,
        recording(2, 1 / delay, 100 + p),
        (k) => 2 * p + k,
        () => '',
      );
    const options = ['--pair-delay', '12 ms', '--pair-rate', '15 Hz'];
    const { samples, record } = await processed('pairs', 'frame,x,y', rows, options);
    // 700 particles, 4 % lost in either frame: about 645 pairs of detections each.
    expect(samples.length).toBeGreaterThan(0.9 * pairs * 645);
    for (const sample of samples.slice(0, 2000)) {
      const pair = sample['frame'] / 2;
      expect(Number.isInteger(pair)).toBe(true);
      expect(sample['t']).toBeCloseTo(pair / 15 + delay / 2, 9);
      expect(sample['ax']).toBeNaN();
    }
    // Noise of a difference: 0.005 mm sqrt(2) / 12 ms = 0.59 mm/s; the chord over 12 ms bends little in this flow.
    const { rms, stated } = velocityError(samples, rows);
    const noise = (0.005 * Math.SQRT2) / delay;
    expect(rms).toBeGreaterThan(0.9 * noise);
    expect(rms).toBeLessThan(2 * noise);
    expect(stated).toBeGreaterThan(0.6 * rms);
    expect(stated).toBeLessThan(1.7 * rms);
    expect(record.counts.links).toBe(samples.length);
  });
});

describe('bursts', () => {
  it('are never linked across, and time runs on between them', async () => {
    const rows: Rows = { line: [], particle: [] };
    for (let b = 0; b < 4; b++)
      append(
        rows,
        recording(15, 80, 200 + b),
        (k) => 15 * b + k,
        () => '',
      );
    const options = ['--rate', '80 Hz', '--burst-frames', '15', '--burst-every', '2 s'];
    const { samples } = await processed('bursts', 'frame,x,y', rows, options);
    const bursts = new Map<number, number>();
    for (const sample of samples) {
      const burst = Math.floor(sample['frame'] / 15);
      expect(bursts.get(sample['pathline']) ?? burst).toBe(burst);
      bursts.set(sample['pathline'], burst);
      expect(sample['t']).toBeCloseTo(2 * burst + (sample['frame'] % 15) / 80, 9);
    }
    expect(new Set(bursts.values()).size).toBe(4);
    const { rms, stated } = velocityError(samples, rows);
    expect(rms).toBeLessThan(1);
    expect(rms / stated).toBeLessThan(2);
  });
});

describe('a time column', () => {
  it('is used as it stands: uneven times and dropped frames give the same velocities', async () => {
    const rows: Rows = { line: [], particle: [] };
    const dump = recording(400, 800, 300);
    // A clock that wavers: steps of 10, 12, 9, 13, ... / 800 s; every 9th frame is dropped.
    const steps = [10, 12, 9, 13, 10, 14, 8];
    const chosen: number[] = [0];
    for (let n = 0; chosen[chosen.length - 1] + 14 < 400; n++) chosen.push(chosen[chosen.length - 1] + steps[n % 7]);
    const place = new Map(chosen.map((k, n) => [k, n] as const));
    const kept: TruthDump = dump;
    for (let row = 0; row < kept.x.length; row++) {
      const n = place.get(kept.frame[row]);
      if (n === undefined || n % 9 === 8) continue;
      rows.line.push(`${n},${kept.x[row] / SCALE},${kept.y[row] / SCALE},${kept.time[kept.frame[row]]}`);
      rows.particle.push(kept.particle[row]);
    }
    const { samples } = await processed('times', 'frame,x,y,t', rows, ['--times', 'yes']);
    expect(samples.length).toBeGreaterThan(0.85 * rows.particle.filter((id) => id >= 0).length);
    for (const sample of samples.slice(0, 500)) {
      expect(sample['t']).toBeCloseTo(chosen[sample['frame']] / 800, 9);
    }
    const { rms, stated } = velocityError(samples, rows);
    expect(rms).toBeLessThan(1);
    expect(rms / stated).toBeLessThan(2);
  });
});

describe('pathline numbers in the dump', () => {
  const rows: Rows = { line: [], particle: [] };
  append(
    rows,
    recording(25, 80, 400),
    (k) => k,
    () => '',
  );
  const numbered = { ...rows, line: rows.line.map((line, row) => `${line},${rows.particle[row]}`) };

  it('are kept', async () => {
    const options = ['--rate', '80 Hz', '--pathline-numbers', 'keep', '--pathline-column', 'path'];
    const { samples, record } = await processed('keep', 'frame,x,y,path', numbered, options);
    for (const sample of samples) expect(rows.particle[sample['detection']]).toBeGreaterThanOrEqual(0);
    const particleOf = new Map<number, number>();
    for (const sample of samples) {
      const particle = rows.particle[sample['detection']];
      expect(particleOf.get(sample['pathline']) ?? particle).toBe(particle);
      particleOf.set(sample['pathline'], particle);
    }
    expect(record.counts.samples).toBe(samples.length);
  });

  it('are missed where no column holds them', async () => {
    const dump = join(folder, 'bare.csv');
    writeFileSync(dump, `frame,x,y\n${rows.line.slice(0, 2000).join('\n')}\n`);
    const options = ['--rate', '80 Hz', '--pathline-numbers', 'keep', '--out', join(folder, 'bare')];
    const { code, stderr } = await runCli(['process', dump, ...options]);
    expect(code).toBe(2);
    expect(stderr).toContain('no column of pathline numbers');
  });

  it('are checked against links of our own', async () => {
    const options = ['--rate', '80 Hz', '--pathline-numbers', 'check', '--pathline-column', 'path'];
    const { samples } = await processed('check', 'frame,x,y,path', numbered, options);
    expect(samples.length).toBeGreaterThan(0.9 * rows.particle.filter((id) => id >= 0).length);
    const log = readFileSync(join(folder, 'check', 'log.ndjson'), 'utf8');
    const event = log
      .trim()
      .split('\n')
      .map((line) => JSON.parse(line))
      .find((entry) => entry.code === 'linking/given-pathlines');
    expect(event.details.links).toBeGreaterThan(14_000);
    expect(event.details.agreed / event.details.links).toBeGreaterThan(0.97);
    expect(event.details.agreed).toBeLessThanOrEqual(event.details.links);
  });
});
