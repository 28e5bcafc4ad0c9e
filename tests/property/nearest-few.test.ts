import { cubeRoot } from '@wakeloom/tracker/math/cube-root';
import { medianInPlace, medianOfFew, selectRank } from '@wakeloom/tracker/math/median';
import { NearestFew } from '@wakeloom/tracker/math/nearest-few';
import { Ranking } from '@wakeloom/tracker/math/ranking';
import { sortEight } from '@wakeloom/tracker/math/sort-eight';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { median as peerMedian } from 'simple-statistics';
import { describe, expect, it } from 'vitest';

/** Clouds of different shape: even, on a lattice with ties, in a thin strip, a third at one place, in clusters with a far stray point. */
function cloud(kind: number, n: number, seed: string): { x: Float64Array; y: Float64Array; z: Float64Array } {
  const random = randomStream(23, seed);
  const coordinate = (axis: number, i: number): number => {
    if (kind === 0) return 100 * random.uniform();
    if (kind === 1) return axis === 0 ? i % 7 : axis === 1 ? Math.floor(i / 7) % 7 : Math.floor(i / 49);
    if (kind === 2) return (axis === 0 ? 1000 : 0.001) * random.uniform() - 500;
    // Many at one place: more than the quick way takes.
    if (kind === 3) return i % 3 === 0 ? 50 : 100 * random.uniform();
    return i === 0 ? 1e6 : (i % 5) * 10 + random.normal();
  };
  const column = (axis: number) => Float64Array.from({ length: n }, (_, i) => coordinate(axis, i));
  return { x: column(0), y: column(1), z: column(2) };
}

describe('nearest few', () => {
  it('agree with looking at every point, at equal distance by slot', () => {
    for (const dims of [2, 3] as const) {
      for (let kind = 0; kind < 5; kind++) {
        for (const n of [1, 5, 9, 60, 400, 1200]) {
          const points = cloud(kind, n, `${dims} ${kind} ${n}`);
          const search = new NearestFew(8);
          search.build(
            points,
            Uint32Array.from({ length: n }, (_, i) => i),
            n,
            dims,
          );
          for (let i = 0; i < n; i += n > 100 ? 7 : 1) {
            const square = (j: number) => {
              const d2 = (points.x[j]! - points.x[i]!) ** 2 + (points.y[j]! - points.y[i]!) ** 2;
              return dims === 3 ? d2 + (points.z[j]! - points.z[i]!) ** 2 : d2;
            };
            const all = Array.from({ length: n }, (_, j) => j).filter((j) => j !== i);
            const slot = (j: number) => search.slotOf[j]!;
            const want = all.sort((a, b) => square(a) - square(b) || slot(a) - slot(b)).slice(0, 8);
            const found = search.near(slot(i));
            const rows = Array.from(search.slots.subarray(8 * slot(i), 8 * slot(i) + found), (at) => search.rowOf[at]!);
            if (rows.some((row, rank) => row !== want[rank])) expect(rows).toEqual(want);
            expect(found).toBe(Math.min(8, n - 1));
          }
        }
      }
    }
  });

  it('can be built again for fewer and for more points', () => {
    const search = new NearestFew(3);
    for (const n of [50, 4, 300]) {
      const points = cloud(0, n, `again ${n}`);
      const rows = Uint32Array.from({ length: n }, (_, i) => i);
      search.build(points, rows, n, 2);
      expect(search.near(search.slotOf[n - 1]!)).toBe(3);
      const nearest = search.rowOf[search.slots[3 * search.slotOf[n - 1]!]!]!;
      const distance = (j: number) => Math.hypot(points.x[j]! - points.x[n - 1]!, points.y[j]! - points.y[n - 1]!);
      const best = Math.min(...Array.from(rows.subarray(0, n - 1), distance));
      expect(distance(nearest)).toBeCloseTo(best, 12);
    }
  });
});

describe('medians and roots', () => {
  it('agree with simple-statistics, ties and all', () => {
    const random = randomStream(24, 'medians');
    for (let n = 1; n < 60; n++) {
      const values = Float64Array.from(
        { length: n },
        () => (Math.round(8 * random.normal()) + 0) / (n % 2 === 0 ? 1 : 7),
      );
      const want = peerMedian(Array.from(values));
      expect(medianInPlace(values.slice(), n)).toBe(want);
      expect(medianOfFew(values.slice(), n)).toBe(want);
      const sorted = values.slice().sort();
      for (let rank = 0; rank < n; rank++) expect(selectRank(values.slice(), 0, n, rank)).toBe(sorted[rank]);
    }
    expect(medianInPlace(new Float64Array(4), 0)).toBeNaN();
  });

  it('ranks of a few values, of equal ones the first first', () => {
    const random = randomStream(25, 'ranks');
    for (let n = 0; n < 40; n++) {
      const values = Float64Array.from({ length: n + 1 }, () => Math.round(6 * random.normal()));
      const inOrder = Array.from({ length: n }, (_, i) => i).sort((a, b) => values[a]! - values[b]! || a - b);
      const rank = new Ranking(40).of(values, n);
      expect(inOrder.map((i) => rank[i])).toEqual(inOrder.map((_, place) => place));
    }
  });

  it('eight values in order, every pattern of equal and unequal ones', () => {
    // All 6561 choices of eight among three values hold every pattern of ties of two and more.
    const into = new Float64Array(8);
    for (let code = 0; code < 3 ** 8; code++) {
      const values = Array.from({ length: 8 }, (_, i) => (Math.floor(code / 3 ** i) % 3) - 1);
      const [a, b, c, d, e, f, g, h] = values;
      sortEight(a!, b!, c!, d!, e!, f!, g!, h!, into);
      const want = values.sort((p, q) => p - q);
      if (want.some((value, i) => value !== into[i])) expect(Array.from(into)).toEqual(want);
    }
    const random = randomStream(26, 'eight');
    for (let trial = 0; trial < 2000; trial++) {
      const values = Array.from({ length: 8 }, () => random.normal());
      const [a, b, c, d, e, f, g, h] = values;
      sortEight(a!, b!, c!, d!, e!, f!, g!, h!, into);
      expect(Array.from(into)).toEqual(values.sort((p, q) => p - q));
    }
  });

  it('cube root of cubes', () => {
    for (const root of [1e-4, 0.1, 0.5, 1, 3, 7.25, 1e5])
      expect(Math.abs(cubeRoot(root ** 3) / root - 1)).toBeLessThan(1e-15);
  });
});
