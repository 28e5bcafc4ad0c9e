import { LeastSquares } from '@wakeloom/tracker/math/least-squares';
import { NearestFew } from '@wakeloom/tracker/math/nearest-few';
import { normalisedMedianResidual, surelyPassesEight } from '@wakeloom/tracker/screening/normalised-median';
import { PlaneTest } from '@wakeloom/tracker/screening/plane-test';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { median } from 'simple-statistics';
import { describe, expect, it } from 'vitest';

describe('short cuts of the screening', () => {
  it('what surely passes the median test does, and nearly all that passes is seen to', () => {
    const random = randomStream(40, 'surely');
    const slots = Int32Array.from({ length: 8 }, (_, i) => 7 - i);
    const sorted = new Float64Array(8);
    let passing = 0;
    let shown = 0;
    for (let trial = 0; trial < 40_000; trial++) {
      // Coarse values half the time: ties, spreads of 0, residuals at the very threshold.
      const value = () => (trial % 2 === 0 ? random.normal() : Math.round(2 * random.normal()) / 2);
      const neighbours = Float64Array.from({ length: 8 }, value);
      const centre = (trial % 3 === 0 ? 4 : 1) * value();
      const epsilon = trial % 5 === 0 ? 1e-9 : 0.5 * random.uniform();
      const passes = normalisedMedianResidual(centre, neighbours.slice(), 8, epsilon) <= 2;
      const surely = surelyPassesEight(neighbours, slots, 0, centre, epsilon, 2, sorted);
      if (surely && !passes) expect([centre, epsilon, ...neighbours]).toBe('passing');
      if (passes) passing++;
      if (surely) shown++;
    }
    expect(passing).toBeGreaterThan(20_000);
    expect(passing).toBeLessThan(38_000);
    expect(shown).toBeGreaterThan(0.9 * passing);
  });

  it('plane through the neighbours: deviation and spread as general least squares give them', () => {
    const random = randomStream(41, 'plane');
    const n = 60;
    for (const dims of [2, 3] as const) {
      for (let trial = 0; trial < 40; trial++) {
        const column = () => Float64Array.from({ length: n }, () => 10 * random.uniform());
        const points = { x: column(), y: column(), z: column() };
        const search = new NearestFew(8);
        const rows = Uint32Array.from({ length: n }, (_, i) => i);
        search.build(points, rows, n, dims);
        const velocity = Float64Array.from({ length: n }, (_, slot) => 3 * search.px[slot]! + random.normal());
        const plane = new PlaneTest(search, 8);
        const found = search.near(5);
        for (const without of [-1, search.slots[8 * 5 + 3]!]) {
          const used = Array.from(search.slots.subarray(40, 48)).filter((slot) => slot !== without);
          const design = used.flatMap((slot) => {
            const offsets = [search.px[slot]! - search.px[5]!, search.py[slot]! - search.py[5]!];
            return dims === 3 ? [1, ...offsets, search.pz[slot]! - search.pz[5]!] : [1, ...offsets];
          });
          const values = Float64Array.from(used, (slot) => velocity[slot]!);
          const p = dims + 1;
          const at = new LeastSquares(Float64Array.from(design), used.length, p).solve(values);
          const residuals = used.map((_, i) => {
            let fitted = 0;
            for (let a = 0; a < p; a++) fitted += at[a]! * design[i * p + a]!;
            return Math.abs(values[i]! - fitted);
          });
          const want = median(residuals) * Math.sqrt(used.length / (used.length - p));
          // Normal equations of eight points lose digits with the square of their condition, here at most 1e4.
          expect(plane.spread(velocity, 5, found, without)).toBeCloseTo(want, 6);
          expect(plane.deviation).toBeCloseTo(Math.abs(velocity[5]! - at[0]!), 6);
        }
      }
    }
  });
});
