import kdTreeModule, { type kdTree as KdTreeJavascript } from 'kd-tree-javascript';
import type { Dims } from '../core/columns.js';
import type { PointColumns } from './neighbour-search.js';

/** Rows the library is asked for first in a radius search; doubled until it has some to spare. */
const FIRST_ASK = 16;

/** 2^-52: relative distance from one double to the next. */
const EPSILON = 2.220446049250313e-16;

interface KdPoint {
  readonly x: number;
  readonly y: number;
  readonly z: number;
  readonly row: number;
}

/** A k-d tree over rows of point columns; a snapshot, later changes of the columns are not seen. Made by `buildKdTree`. */
export interface KdTree {
  readonly size: number;
  readonly dims: Dims;
  /** The library's tree; not to be changed, its `insert` and `remove` are faulty. */
  readonly tree: KdTreeJavascript<KdPoint>;
}

/** Rows found, nearest first, equal distances by ascending row. [found] each, new. */
export interface KdNeighbours {
  readonly row: Int32Array;
  /** Square of the distance: dx^2 + dy^2 (+ dz^2), summed in this order. */
  readonly square: Float64Array;
}

/** A place to search from; z is not looked at in the plane. */
export interface KdQuery {
  readonly x: number;
  readonly y: number;
  readonly z?: number;
}

/**
 * Builds a k-d tree over rows `from` .. `to - 1` of the columns (kd-tree-javascript 1.0.3, MIT licence file).
 * It answers k-nearest questions without a radius, and is the second opinion on `CellIndex`; where a reach is known
 * the cell index is one to two orders of magnitude faster. Rows with a NaN coordinate are left out: no distance
 * to them exists. Cost: about 6 us a point at 100 000 points, and an object a point.
 */
export function buildKdTree(points: PointColumns, dims: Dims, from = 0, to = points.x.length): KdTree {
  const list: KdPoint[] = [];
  for (let row = from; row < to; row++) {
    const x = points.x[row];
    const y = points.y[row];
    const z = dims === 3 ? points.z[row] : 0;
    if (!Number.isNaN(x + y + z)) list.push({ x, y, z, row });
  }
  // The constructor sorts the array it is given: taken before, and the array is ours.
  const size = list.length;
  // A CommonJS module: Node finds the class on the default import only.
  const { kdTree: Tree } = kdTreeModule;
  // While pruning, the library measures from points that carry the named dimensions only: a distance in the plane
  // that looked at z would be NaN there and cut off branches that hold neighbours.
  const tree = dims === 3 ? new Tree(list, squareInSpace, ['x', 'y', 'z']) : new Tree(list, squareInPlane, ['x', 'y']);
  return { size, dims, tree };
}

/**
 * The k nearest rows, fewer where the tree holds fewer. Exact; among rows at the same distance the lower ones are
 * taken, also where the k-th place falls between them. A NaN query has no neighbours.
 * Cost: about 30 us a query for k = 8 among 2000 points.
 */
export function kdNearest(tree: KdTree, query: KdQuery, k: number): KdNeighbours {
  const at = pointOf(tree, query);
  if (at === null || !(k >= 1)) return sortedRows([], at, 0);
  const found = tree.tree.nearest(at, Math.min(k, tree.size));
  let largest = 0;
  for (const [point] of found) largest = Math.max(largest, squareInSpace(at, point));
  // The library keeps any of several rows at the k-th distance: fetch them all and let the row decide.
  return sortedRows(within(tree, at, largest), at, k);
}

/**
 * All rows within `radius`, border included: dx^2 + dy^2 (+ dz^2) <= radius^2 in double arithmetic. A negative or
 * NaN radius holds nothing. Cost: 10 to 70 us a query at 2000 points.
 */
export function kdWithin(tree: KdTree, query: KdQuery, radius: number): KdNeighbours {
  const at = pointOf(tree, query);
  if (at === null || !(radius >= 0)) return sortedRows([], at, 0);
  return sortedRows(within(tree, at, radius * radius), at, tree.size);
}

function pointOf(tree: KdTree, query: KdQuery): KdPoint | null {
  const z = tree.dims === 3 ? (query.z ?? Number.NaN) : 0;
  if (tree.size === 0 || Number.isNaN(query.x + query.y + z)) return null;
  return { x: query.x, y: query.y, z, row: -1 };
}

/** Points with square <= limit, in no order. */
function within(tree: KdTree, at: KdPoint, limit: number): KdPoint[] {
  // The library's bound is exclusive, and a bound of 0 means none: ask just beyond and judge here.
  const bound = limit * (1 + EPSILON) + Number.MIN_VALUE;
  // With a bound the library fills a heap of as many entries as it is asked for: asking for all rows would cost
  // more than the search. Ask for few, and for more only where all of these were found.
  for (let ask = FIRST_ASK; ; ask *= 2) {
    const found = tree.tree.nearest(at, Math.min(ask, tree.size), bound);
    if (found.length < ask || ask >= tree.size) {
      return found.map(([point]) => point).filter((point) => squareInSpace(at, point) <= limit);
    }
  }
}

/** The first `most` by distance, then row. */
function sortedRows(points: KdPoint[], at: KdPoint | null, most: number): KdNeighbours {
  const pairs = at === null ? [] : points.map((point) => ({ row: point.row, square: squareInSpace(at, point) }));
  pairs.sort((a, b) => a.square - b.square || a.row - b.row);
  const kept = pairs.slice(0, most);
  return { row: Int32Array.from(kept, ({ row }) => row), square: Float64Array.from(kept, ({ square }) => square) };
}

function squareInPlane(a: KdPoint, b: KdPoint): number {
  const dx = a.x - b.x;
  const dy = a.y - b.y;
  return dx * dx + dy * dy;
}

/** In the plane z is 0 everywhere, so this is also the square there. */
function squareInSpace(a: KdPoint, b: KdPoint): number {
  const dz = a.z - b.z;
  return squareInPlane(a, b) + dz * dz;
}
