import type { Dims } from '../core/columns.js';
import type { NeighbourSearch, PointColumns } from './neighbour-search.js';
import { buildKdTree, type KdTree, kdWithin } from './neighbours-kdtree.js';

/**
 * The same neighbours from kd-tree-javascript, in coordinates divided by the reach per axis. One to two orders of
 * magnitude slower than `CellIndex`; kept as a second opinion and for comparison.
 */
export class KdSearch implements NeighbourSearch {
  private tree: KdTree | null = null;
  private dims: Dims = 2;
  private from = 0;
  private scale: [number, number, number] = [1, 1, 1];
  private points: PointColumns = { x: new Float64Array(0), y: new Float64Array(0), z: new Float64Array(0) };

  build(points: PointColumns, from: number, to: number, dims: Dims, reach: readonly [number, number, number]): void {
    this.dims = dims;
    this.points = points;
    this.scale = [1 / reach[0], 1 / reach[1], dims === 3 ? 1 / reach[2] : 0];
    const [sx, sy, sz] = this.scale;
    this.from = from;
    const part = (column: Float64Array, by: number) => column.subarray(from, to).map((value) => value * by);
    this.tree = buildKdTree({ x: part(points.x, sx), y: part(points.y, sy), z: part(points.z, sz) }, dims);
  }

  near(px: number, py: number, pz: number, into: Int32Array): number {
    if (this.tree === null) return 0;
    const { x, y, z } = this.points;
    const [sx, sy, sz] = this.scale;
    // Asked a hair beyond the reach, then judged by the very expression of the cell index, so that both searches
    // agree to the last bit on points that lie on the border.
    const found = kdWithin(this.tree, { x: px * sx, y: py * sy, z: pz * sz }, 1 + 1e-6);
    let kept = 0;
    for (const place of found.row) {
      const row = this.from + place;
      const dx = (x[row] - px) * sx;
      const dy = (y[row] - py) * sy;
      const dz = this.dims === 3 ? (z[row] - pz) * sz : 0;
      if (dx * dx + dy * dy + dz * dz <= 1) into[kept++] = row;
    }
    return kept;
  }
}
