import { createGridAccumulator } from '@wakeloom/tracker/eulerian/accumulate';
import type { GridShape } from '@wakeloom/tracker/eulerian/grid';
import { studentFactor, varianceFactor } from '@wakeloom/tracker/math/student';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { describe, expect, it } from 'vitest';
import { type BinSample, pathlineRows } from '../helpers/pathline-rows.js';

const options = { fewestForMean: 1, fewestForStress: 2, lengthUnit: 'mm', timeUnit: 's' };
const Z95 = 1.959964;
const BINS = 3000;

/** `count` bins in a row along x. */
const row = (count: number): GridShape => ({
  dims: 2,
  count: [count, 1, 1],
  first: [0.5, 0.5, 0],
  step: [1, 1, 1],
  size: [1, 1, 1],
});

/** Means u = 7, v = 0; uu = 9, uv = 4.5, vv = 2.25 + 4; each pathline has a fluctuation of its own and one a sample. */
function statistics(pathlines: number, lengths: (pathline: number) => number, own: number, seed: string) {
  const random = randomStream(91, seed);
  const samples: BinSample[] = [];
  const [ofPathline, ofSample] = [Math.sqrt(own), Math.sqrt(1 - own)];
  for (let bin = 0; bin < BINS; bin++) {
    for (let p = 0; p < pathlines; p++) {
      const [a, b] = [random.normal(), random.normal()];
      for (let k = 0; k < lengths(p); k++) {
        const u = 3 * (ofPathline * a + ofSample * random.normal());
        const v = 0.5 * u + 2 * (ofPathline * b + ofSample * random.normal());
        samples.push({ pathline: bin * pathlines + p, x: bin + 0.5, y: 0.5, u: 7 + u, v });
      }
    }
  }
  const grid = createGridAccumulator(row(BINS), 2, options);
  grid.add(pathlineRows(samples));
  const { fields } = grid.finish();
  const of = (name: string, truth: number) => {
    const { values } = fields.get(name)!;
    const errors = fields.get(`${name}_se`)!.values;
    let sum = 0;
    let covered = 0;
    for (let bin = 0; bin < BINS; bin++) {
      sum += values[bin]!;
      if (Math.abs(values[bin]! - truth) <= Z95 * errors[bin]!) covered++;
    }
    return { mean: sum / BINS, covered: covered / BINS };
  };
  return { u: of('u', 7), uu: of('uu', 9), uv: of('uv', 4.5), vv: of('vv', 6.25) };
}

describe('few pathlines in a bin', () => {
  const even = (_: number) => 6;
  const uneven = (p: number) => 1 + ((5 * p) % 9);
  for (const own of [1, 0.6]) {
    for (const [name, lengths] of [
      ['of one length', even],
      ['of unequal length', uneven],
    ] as const) {
      for (const pathlines of [3, 5, 10, 20, 50]) {
        it(`${pathlines} ${name}, ${own} of the variance their own: no bias, 95 % intervals cover`, () => {
          const s = statistics(pathlines, lengths, own, `${pathlines} ${name} ${own}`);
          // Five standard deviations of the share and of the mean over 3000 bins.
          const band = 5 * Math.sqrt((0.95 * 0.05) / BINS);
          expect(s.u.covered).toBeGreaterThan(0.95 - band);
          // Three of unequal length are down to one degree of freedom and a half, where the factor errs upwards.
          expect(s.u.covered).toBeLessThan(pathlines === 3 ? 1 : 0.98);
          if (pathlines < 10) {
            expect(s.uu.mean).toBeNaN();
            return;
          }
          const spread = 5 * Math.sqrt(2 / pathlines / BINS) * 1.3;
          expect(Math.abs(s.uu.mean / 9 - 1)).toBeLessThan(spread);
          expect(Math.abs(s.vv.mean / 6.25 - 1)).toBeLessThan(spread);
          expect(Math.abs(s.uv.mean / 4.5 - 1)).toBeLessThan(1.7 * spread);
          for (const { covered } of [s.uu, s.vv, s.uv]) expect(covered).toBeGreaterThan(0.95 - band);
        });
      }
    }
  }
});

it('no standard error of a mean from two pathlines, no stress from nine, however many samples', () => {
  const samples = (pathlines: number, bin: number): BinSample[] =>
    Array.from({ length: pathlines * 20 }, (_, i) => ({
      pathline: 100 * bin + Math.floor(i / 20),
      x: bin + 0.5,
      y: 0.5,
      u: Math.floor(i / 20) % 3,
      v: i % 7,
    }));
  const grid = createGridAccumulator(row(4), 2, { ...options, fewestForMean: 5, fewestForStress: 30 });
  grid.add(pathlineRows([2, 3, 9, 10].flatMap((pathlines, bin) => samples(pathlines, bin))));
  const { fields } = grid.finish();
  const there = (name: string) => Array.from(fields.get(name)!.values, (value) => !Number.isNaN(value));
  expect(there('u')).toEqual([true, true, true, true]);
  expect(there('u_se')).toEqual([false, true, true, true]);
  for (const name of ['uu', 'uv_se', 'vv_raw']) expect(there(name)).toEqual([false, false, false, true]);
});

describe('factors for few degrees of freedom', () => {
  it("Student's t against its published table", () => {
    // Two-sided 95 % points, as in any table of the t distribution.
    const table = [
      [1, 12.706205],
      [2, 4.302653],
      [3, 3.182446],
      [4, 2.776445],
      [5, 2.570582],
      [9, 2.262157],
      [10, 2.228139],
      [20, 2.085963],
      [30, 2.042273],
      [60, 2.000298],
      [120, 1.97993],
    ] as const;
    for (const [freedom, t] of table) expect(Math.abs((studentFactor(freedom) * Z95) / t - 1)).toBeLessThan(1.3e-3);
    for (let nu = 1; nu < 6; nu += 0.1) expect(studentFactor(nu)).toBeGreaterThan(studentFactor(nu + 0.1));
  });

  it('that of a variance reaches the 5 % point of chi square', () => {
    // 5 % points of chi square, as in any table.
    for (const [freedom, point] of [
      [5, 1.145476],
      [9, 3.325113],
      [19, 10.117013],
      [49, 33.930306],
    ] as const) {
      const low = 1 + Z95 * varianceFactor(freedom) * Math.sqrt(2 / freedom);
      expect(Math.abs((low * point) / freedom - 1)).toBeLessThan(freedom < 9 ? 0.02 : 0.01);
    }
    expect(varianceFactor(2000)).toBe(studentFactor(2000));
  });
});
