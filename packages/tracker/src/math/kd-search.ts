import { kdTree as KdTree } from 'kd-tree-javascript';
import type { Dims } from '../core/columns.js';
import type { NeighbourSearch, PointColumns } from './neighbour-search.js';

interface KdPoint {
  readonly x: number;
  readonly y: number;
  readonly z: number;
  readonly row: number;
}

/**
 * The same neighbours from kd-tree-javascript, in coordinates divided by the reach per axis. One to two orders of
 * magnitude slower than `CellIndex`; kept as a second opinion and for comparison.
 */
export class KdSearch implements NeighbourSearch {
  private tree: KdTree<KdPoint> | null = null;
  private count = 0;
  private dims: Dims = 2;
  private reach: readonly [number, number, number] = [1, 1, 1];
  private points: PointColumns = { x: new Float64Array(0), y: new Float64Array(0), z: new Float64Array(0) };

  build(points: PointColumns, from: number, to: number, dims: Dims, reach: readonly [number, number, number]): void {
    const list: KdPoint[] = [];
    for (let row = from; row < to; row++) {
      list.push({
        x: points.x[row] / reach[0],
        y: points.y[row] / reach[1],
        z: dims === 3 ? points.z[row] / reach[2] : 0,
        row,
      });
    }
    this.count = list.length;
    this.dims = dims;
    this.reach = reach;
    this.points = points;
    // The constructor sorts the array it is given: it is ours.
    this.tree = new KdTree(list, squareBetween, dims === 3 ? ['x', 'y', 'z'] : ['x', 'y']);
  }

  near(px: number, py: number, pz: number, into: Int32Array): number {
    if (this.tree === null || this.count === 0 || !(px === px && py === py && pz === pz)) return 0;
    const query = {
      x: px / this.reach[0],
      y: py / this.reach[1],
      z: this.dims === 3 ? pz / this.reach[2] : 0,
      row: -1,
    };
    // The library's bound is exclusive: ask a hair beyond 1, then judge by the very expression of the cell index,
    // so that both searches agree on points that lie on the border to the last bit.
    const found = this.tree.nearest(query, this.count, 1 + 1e-9);
    const { x, y, z } = this.points;
    const scaleX = 1 / this.reach[0];
    const scaleY = 1 / this.reach[1];
    const scaleZ = this.dims === 3 ? 1 / this.reach[2] : 0;
    let kept = 0;
    for (const [{ row }] of found) {
      const dx = (x[row] - px) * scaleX;
      const dy = (y[row] - py) * scaleY;
      const dz = this.dims === 3 ? (z[row] - pz) * scaleZ : 0;
      if (dx * dx + dy * dy + dz * dz <= 1) into[kept++] = row;
    }
    return kept;
  }
}

function squareBetween(a: KdPoint, b: KdPoint): number {
  const dx = a.x - b.x;
  const dy = a.y - b.y;
  const dz = a.z - b.z;
  return dx * dx + dy * dy + dz * dz;
}
