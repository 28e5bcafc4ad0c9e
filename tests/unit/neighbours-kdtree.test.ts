import { buildKdTree, type KdTree, kdNearest, kdWithin } from '@wakeloom/tracker/math/neighbours-kdtree';
import { describe, expect, it } from 'vitest';
import { uniform } from '../helpers/detections.js';

type Dims = 2 | 3;

function cloud(dims: Dims, n: number, seed: number, unit = 1, steps = 0) {
  const random = uniform(seed);
  // With `steps` the places lie on a lattice: many equal distances.
  const place = () => (steps > 0 ? Math.floor(random() * steps) : random()) * unit;
  const column = (length: number) => Float64Array.from({ length }, place);
  return { x: column(n), y: column(n), z: column(dims === 3 ? n : 0) };
}

/** Every row with its squared distance, sorted by distance and row. */
function all(points: ReturnType<typeof cloud>, dims: Dims, q: readonly number[], from: number, to: number) {
  const list: { row: number; square: number }[] = [];
  for (let row = from; row < to; row++) {
    const dx = points.x[row]! - q[0]!;
    const dy = points.y[row]! - q[1]!;
    const dz = dims === 3 ? points.z[row]! - q[2]! : 0;
    list.push({ row, square: dx * dx + dy * dy + dz * dz });
  }
  return list.sort((a, b) => a.square - b.square || a.row - b.row);
}

const rowsOf = (list: readonly { row: number }[]) => list.map(({ row }) => row);

describe.each([2, 3] as const)('k-d tree in %i-D against every pair', (dims) => {
  it.each<[string, number, number]>([
    ['scattered places', 1, 0],
    ['a lattice with many equal distances', 1, 6],
    ['places in units of 1e-9', 1e-9, 0],
    ['places in units of 1e9', 1e9, 0],
  ])('finds the nearest and those within a radius among %s', (_, unit, steps) => {
    const n = 400;
    const points = cloud(dims, n, 7, unit, steps);
    const tree = buildKdTree(points, dims, 20, n - 20);
    expect(tree.size).toBe(n - 40);
    const random = uniform(8);
    const span = steps > 0 ? steps : 1;
    for (let i = 0; i < 60; i++) {
      const q = [0, 1, 2].map(() => (steps > 0 ? Math.floor(random() * span) : random() * 1.4 - 0.2) * unit);
      const query = { x: q[0]!, y: q[1]!, z: q[2]! };
      const expected = all(points, dims, q, 20, n - 20);
      for (const k of [1, 2, 7, 40, n]) {
        const { row, square } = kdNearest(tree, query, k);
        expect([...row]).toEqual(rowsOf(expected.slice(0, k)));
        expect([...square]).toEqual(expected.slice(0, k).map((pair) => pair.square));
      }
      for (const radius of [0, 0.05 * unit, 0.3 * unit, span * unit, 10 * span * unit]) {
        const inside = expected.filter((pair) => pair.square <= radius * radius);
        expect([...kdWithin(tree, query, radius).row]).toEqual(rowsOf(inside));
      }
    }
  });
});

describe('k-d tree', () => {
  const line = { x: Float64Array.of(0, 3, 6, 3), y: Float64Array.of(0, 4, 8, 4), z: new Float64Array(0) };
  const tree: KdTree = buildKdTree(line, 2);

  it('counts the border of the radius as inside, also a radius of 0', () => {
    expect([...kdWithin(tree, { x: 0, y: 0 }, 5).row]).toEqual([0, 1, 3]);
    expect([...kdWithin(tree, { x: 0, y: 0 }, 4.999999999999999).row]).toEqual([0]);
    expect([...kdWithin(tree, { x: 3, y: 4 }, 0).row]).toEqual([1, 3]);
    expect([...kdWithin(tree, { x: 3, y: 4.5 }, 0).row]).toEqual([]);
    expect([...kdWithin(tree, { x: 0, y: 0 }, Number.POSITIVE_INFINITY).row]).toEqual([0, 1, 3, 2]);
  });

  it('takes the lower rows among equal distances at the k-th place', () => {
    expect([...kdNearest(tree, { x: 3, y: 4 }, 1).row]).toEqual([1]);
    expect([...kdNearest(tree, { x: 3, y: 4 }, 3).row]).toEqual([1, 3, 0]);
    const ring = { x: Float64Array.of(1, 0, -1, 0), y: Float64Array.of(0, 1, 0, -1), z: new Float64Array(0) };
    expect([...kdNearest(buildKdTree(ring, 2), { x: 0, y: 0 }, 2).row]).toEqual([0, 1]);
  });

  it('does not touch the columns and does not see later changes', () => {
    const points = cloud(2, 50, 3);
    const before = structuredClone(points);
    const built = buildKdTree(points, 2);
    expect(points).toEqual(before);
    points.x.fill(9);
    const q = { x: 0.5, y: 0.5 };
    expect([...kdNearest(built, q, 5).row]).toEqual(rowsOf(all(before, 2, [0.5, 0.5], 0, 50).slice(0, 5)));
  });

  it('finds nothing from nowhere, in nothing, and for nothing', () => {
    const none = buildKdTree({ x: new Float64Array(0), y: new Float64Array(0), z: new Float64Array(0) }, 2);
    expect(kdNearest(none, { x: 0, y: 0 }, 3).row.length).toBe(0);
    expect(kdWithin(none, { x: 0, y: 0 }, 3).row.length).toBe(0);
    expect(kdNearest(tree, { x: Number.NaN, y: 0 }, 3).row.length).toBe(0);
    expect(kdNearest(tree, { x: 0, y: 0 }, 0).row.length).toBe(0);
    expect(kdWithin(tree, { x: 0, y: 0 }, -1).row.length).toBe(0);
    expect(kdWithin(tree, { x: 0, y: 0 }, Number.NaN).row.length).toBe(0);
  });

  it('leaves out rows with a NaN coordinate', () => {
    const holes = { x: Float64Array.of(0, Number.NaN, 2), y: Float64Array.of(0, 1, 2), z: new Float64Array(0) };
    expect([...kdNearest(buildKdTree(holes, 2), { x: 0, y: 0 }, 3).row]).toEqual([0, 2]);
  });
});
