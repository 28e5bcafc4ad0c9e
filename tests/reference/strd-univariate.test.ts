import { createGridAccumulator } from '@wakeloom/tracker/eulerian/accumulate';
import { describe, expect, it } from 'vitest';
import strd from '../../data/reference/strd.json' with { type: 'json' };
import { pathlineRows } from '../helpers/pathline-rows.js';

/**
 * Relative accuracy asked for. Certified values have 15 digits; NumAcc3 and NumAcc4 add that their data cannot be
 * written in binary: a deviation of 0.1 from 1e6 (1e7) is off by up to 2^-53 1e6 / 0.1 = 1.1e-9 (1.1e-8) as read.
 */
const DIGITS: Record<string, { mean: number; sd: number }> = {
  Lottery: { mean: 1e-14, sd: 1e-13 },
  Lew: { mean: 1e-14, sd: 1e-13 },
  Mavro: { mean: 1e-14, sd: 1e-12 },
  Michelso: { mean: 1e-14, sd: 1e-12 },
  NumAcc1: { mean: 0, sd: 0 },
  NumAcc2: { mean: 1e-14, sd: 1e-13 },
  NumAcc3: { mean: 1e-14, sd: 1.2e-9 },
  NumAcc4: { mean: 1e-14, sd: 1.2e-8 },
};

interface Pattern {
  readonly first: string;
  readonly then_repeat: readonly string[];
  readonly pairs: number;
}

function valuesOf(data: readonly string[] | Pattern): number[] {
  if ('first' in data) {
    const repeated = Array.from({ length: data.pairs }, () => data.then_repeat).flat();
    return [data.first, ...repeated].map(Number);
  }
  return data.map(Number);
}

describe('NIST StRD univariate sets through the sums of a bin', () => {
  for (const name of Object.keys(DIGITS)) {
    it(name, () => {
      const set = strd.datasets[name as keyof typeof strd.datasets];
      const values = valuesOf(set.data as readonly string[] | Pattern);
      expect(values.length).toBe(Number(set.n));
      const certified = (set as unknown as { certified: { mean: string; sd: string } }).certified;
      const shape = {
        dims: 2 as const,
        count: [1, 1, 1] as const,
        first: [0, 0, 0] as const,
        step: [2, 2, 1] as const,
        size: [2, 2, 1] as const,
      };
      const options = { fewestForMean: 1, fewestForStress: 2, lengthUnit: 'mm', timeUnit: 's' };
      // One sample a pathline, and all samples of one pathline: mean and variance are the same.
      for (const apart of [true, false]) {
        const grid = createGridAccumulator(shape, 2, options);
        // The set along u, its mirror image along v.
        grid.add(pathlineRows(values.map((u, i) => ({ pathline: apart ? i : 0, x: 0, y: 0, u, v: -u }))));
        const { mean, product, samples } = grid.moments(0);
        expect(samples).toBe(values.length);
        const wantMean = Number(certified.mean);
        const wantSd = Number(certified.sd);
        expect(Math.abs(mean[0]! - wantMean)).toBeLessThanOrEqual(DIGITS[name]!.mean * Math.abs(wantMean));
        expect(Math.abs(mean[1]! + wantMean)).toBeLessThanOrEqual(DIGITS[name]!.mean * Math.abs(wantMean));
        for (const k of [0, 2]) {
          expect(Math.abs(Math.sqrt(product[k]!) - wantSd)).toBeLessThanOrEqual(DIGITS[name]!.sd * wantSd);
        }
        // uv of a set and its mirror image is minus the variance.
        expect(Math.abs(product[1]! + wantSd * wantSd)).toBeLessThanOrEqual(2 * DIGITS[name]!.sd * wantSd * wantSd);
      }
    });
  }
});
