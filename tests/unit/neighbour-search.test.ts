import { CellIndex } from '@wakeloom/tracker/math/cell-index';
import { KdSearch } from '@wakeloom/tracker/math/kd-search';
import type { NeighbourSearch, PointColumns } from '@wakeloom/tracker/math/neighbour-search';
import { describe, expect, it } from 'vitest';
import { uniformPoints } from '../helpers/points';

type Reach = readonly [number, number, number];

/** The definition of the interface, row by row. */
function bruteForce(points: PointColumns, dims: 2 | 3, reach: Reach, q: readonly number[]): number[] {
  const found: number[] = [];
  for (let row = 0; row < points.x.length; row++) {
    const dx = (points.x[row] - q[0]) * (1 / reach[0]);
    const dy = (points.y[row] - q[1]) * (1 / reach[1]);
    const dz = dims === 3 ? (points.z[row] - q[2]) * (1 / reach[2]) : 0;
    if (dx * dx + dy * dy + dz * dz <= 1) found.push(row);
  }
  return found;
}

function neighbours(search: NeighbourSearch, count: number, q: readonly number[]): number[] {
  const into = new Int32Array(Math.max(1, count));
  const found = search.near(q[0], q[1], q[2], into);
  return [...into.subarray(0, found)].sort((a, b) => a - b);
}

const SEARCHES: [string, () => NeighbourSearch][] = [
  ['cells', () => new CellIndex()],
  ['kd-tree-javascript', () => new KdSearch()],
];

describe.each(SEARCHES)('neighbour search by %s', (_name, make) => {
  it.each([
    [2, 1, 0],
    [3, 1, 0],
    [2, 1e-9, 0],
    [2, 1e9, 0],
    [3, 1e-9, 0],
    [3, 1e9, 0],
    [2, 1, 1e6],
  ] as const)('finds what brute force finds, dims %d, scale %d, shift %d', (dims, scale, shift) => {
    const points = uniformPoints(400, dims, 7, scale, shift);
    const queries = uniformPoints(60, dims, 8, 1.4 * scale, shift - 0.2 * scale);
    const search = make();
    let pairs = 0;
    for (const share of [0.03, 0.11, 0.6]) {
      const reach: Reach = [share * scale, 0.7 * share * scale, 1.9 * share * scale];
      search.build(points, 0, 400, dims, reach);
      for (let k = 0; k < 60; k++) {
        const q = [queries.x[k], queries.y[k], dims === 3 ? queries.z[k] : 0];
        const expected = bruteForce(points, dims, reach, q);
        pairs += expected.length;
        expect(neighbours(search, 400, q)).toEqual(expected);
      }
    }
    expect(pairs).toBeGreaterThan(100);
  });

  it('takes points on cell borders, on the reach itself and identical points', () => {
    const columns = [0, 1, 2, 3, 4];
    const x = Float64Array.from(columns.flatMap((i) => columns.map(() => i)));
    const y = Float64Array.from(columns.flatMap(() => columns));
    const lattice = { x: Float64Array.of(...x, 2, 2), y: Float64Array.of(...y, 2, 2), z: new Float64Array(0) };
    const search = make();
    search.build(lattice, 0, 27, 2, [1, 1, 1]);
    // (2, 2) has itself three times and four neighbours exactly one reach away.
    expect(neighbours(search, 27, [2, 2, 0])).toEqual([7, 11, 12, 13, 17, 25, 26]);
    expect(neighbours(search, 27, [4, 4, 0])).toEqual([19, 23, 24]);
  });

  it('answers for no point, one point, a slice of rows, and places far away or not a number', () => {
    const search = make();
    const none = { x: new Float64Array(0), y: new Float64Array(0), z: new Float64Array(0) };
    search.build(none, 0, 0, 2, [1, 1, 1]);
    expect(neighbours(search, 1, [0, 0, 0])).toEqual([]);
    const one = { x: Float64Array.of(5), y: Float64Array.of(5), z: new Float64Array(0) };
    search.build(one, 0, 1, 2, [1, 1, 1]);
    expect(neighbours(search, 1, [5.5, 5, 0])).toEqual([0]);
    expect(neighbours(search, 1, [1e12, 5, 0])).toEqual([]);
    expect(neighbours(search, 1, [Number.NaN, 5, 0])).toEqual([]);
    const row = { x: Float64Array.of(0, 1, 2, 3), y: new Float64Array(4), z: new Float64Array(0) };
    search.build(row, 1, 3, 2, [1.5, 1.5, 1.5]);
    expect(neighbours(search, 4, [1.5, 0, 0])).toEqual([1, 2]);
  });
});
