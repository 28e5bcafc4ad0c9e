import type { Dims } from '../core/columns.js';

/** Points as columns; the search borrows them until the next `build`. */
export interface PointColumns {
  readonly x: Float64Array;
  readonly y: Float64Array;
  /** Length 0 in the plane. */
  readonly z: Float64Array;
}

/**
 * Neighbours of a place within a fixed reach, given per axis: the points q with
 * ((qx - px) / rx)^2 + ((qy - py) / ry)^2 (+ ((qz - pz) / rz)^2) <= 1. Exact, border included.
 * Two implementations answer the same: `CellIndex` (typed-array cells, the default because it measures
 * fastest) and `KdSearch` (kd-tree-javascript, selectable and the oracle of the tests).
 */
export interface NeighbourSearch {
  /** Takes rows `from` .. `to - 1` of the columns. Cost O(n). */
  build(points: PointColumns, from: number, to: number, dims: Dims, reach: readonly [number, number, number]): void;
  /**
   * Writes the row numbers of the neighbours of (px, py, pz) into `into` and returns how many there are.
   * `into` must be long enough for every row (`to - from`); order is not defined, callers break ties by row.
   */
  near(px: number, py: number, pz: number, into: Int32Array): number;
}
