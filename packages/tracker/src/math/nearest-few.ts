import type { Dims } from '../core/columns.js';
import type { PointColumns } from './neighbour-search.js';

/** Points a cell should hold on average: measured best between 1 and 4 for eight neighbours in the plane. */
const POINTS_PER_CELL = 2;

/**
 * The k nearest other points of each point, among scattered points without a given reach. Square (cubic) cells with
 * about two points each; cells are looked at in growing rings until no closer point can lie outside, so the answer is
 * exact. Cells follow from the points alone. At equal distance the point met first in cell order counts as nearer.
 * Cost for k = 8: about 0.15 us a query in the plane. Mutable: one a user; buffers are kept between builds.
 */
export class NearestFew {
  /** Rows of the neighbours of the last query, nearest first. [k] */
  readonly rows: Uint32Array;
  private readonly k: number;
  private readonly square: Float64Array;
  private dims: Dims = 2;
  private edge = 1;
  private minX = 0;
  private minY = 0;
  private minZ = 0;
  private countX = 1;
  private countY = 1;
  private countZ = 1;
  private start = new Uint32Array(2);
  private slotRow = new Uint32Array(0);
  private slotOf = new Uint32Array(0);
  private cellOf = new Uint32Array(0);
  private px = new Float64Array(0);
  private py = new Float64Array(0);
  private pz = new Float64Array(0);

  constructor(k: number) {
    this.k = k;
    this.rows = new Uint32Array(k);
    this.square = new Float64Array(k);
  }

  /** Takes the points `points[candidates[0 .. count - 1]]`, all finite. Cost O(count). */
  build(points: PointColumns, candidates: Uint32Array, count: number, dims: Dims): void {
    this.dims = dims;
    if (this.slotRow.length < count) this.grow(count);
    const { x, y, z } = points;
    const deep = dims === 3;
    let minX = Number.POSITIVE_INFINITY;
    let minY = minX;
    let minZ = minX;
    let maxX = Number.NEGATIVE_INFINITY;
    let maxY = maxX;
    let maxZ = maxX;
    for (let i = 0; i < count; i++) {
      const r = candidates[i]!;
      const qx = x[r]!;
      const qy = y[r]!;
      if (qx < minX) minX = qx;
      if (qx > maxX) maxX = qx;
      if (qy < minY) minY = qy;
      if (qy > maxY) maxY = qy;
      if (deep) {
        const qz = z[r]!;
        if (qz < minZ) minZ = qz;
        if (qz > maxZ) maxZ = qz;
      }
    }
    this.minX = minX;
    this.minY = minY;
    this.minZ = deep ? minZ : 0;
    const extents = deep ? [maxX - minX, maxY - minY, maxZ - minZ] : [maxX - minX, maxY - minY];
    const edge = cellEdge(extents, count / POINTS_PER_CELL);
    this.edge = edge;
    this.countX = cells(extents[0]!, edge);
    this.countY = cells(extents[1]!, edge);
    this.countZ = deep ? cells(extents[2]!, edge) : 1;
    const total = this.countX * this.countY * this.countZ;
    if (this.start.length < total + 1) this.start = new Uint32Array(total + 1);
    const { start, cellOf, slotOf, slotRow, px, py, pz, countX, countY } = this;
    start.fill(0, 0, total + 1);
    for (let i = 0; i < count; i++) {
      const r = candidates[i]!;
      const cx = Math.trunc((x[r]! - minX) / edge);
      const cy = Math.trunc((y[r]! - minY) / edge);
      const cz = deep ? Math.trunc((z[r]! - minZ) / edge) : 0;
      const cell = (cz * countY + cy) * countX + cx;
      cellOf[i] = cell;
      start[cell + 1] = start[cell + 1]! + 1;
    }
    for (let cell = 0; cell < total; cell++) start[cell + 1] = start[cell + 1]! + start[cell]!;
    for (let i = count - 1; i >= 0; i--) {
      // Filled from the back of each cell; afterwards start[cell + 1] is the cell's first slot.
      const cell = cellOf[i]! + 1;
      const slot = start[cell]! - 1;
      start[cell] = slot;
      const r = candidates[i]!;
      slotOf[i] = slot;
      slotRow[slot] = r;
      px[slot] = x[r]!;
      py[slot] = y[r]!;
      if (deep) pz[slot] = z[r]!;
    }
    // start[c + 1] now holds the first slot of cell c: shift back by one.
    for (let cell = 0; cell < total; cell++) start[cell] = start[cell + 1]!;
    start[total] = count;
  }

  /** Finds the neighbours of candidate `i`; returns how many there are (k, or all others where there are fewer). */
  near(i: number): number {
    const { px, py, pz, dims, countX, countY, countZ, edge, k, square } = this;
    const own = this.slotOf[i]!;
    const qx = px[own]!;
    const qy = py[own]!;
    const qz = dims === 3 ? pz[own]! : 0;
    const cell = this.cellOf[i]!;
    const cx = cell % countX;
    const line = (cell - cx) / countX;
    const cy = line % countY;
    const cz = (line - cy) / countY;
    let found = 0;
    for (let ring = 1; ; ring++) {
      const x0 = cx - ring;
      const x1 = cx + ring;
      const y0 = cy - ring;
      const y1 = cy + ring;
      const z0 = cz - ring;
      const z1 = cz + ring;
      found = this.takeRing(ring, cx, cy, cz, own, qx, qy, qz, found);
      // No point outside the block of cells is nearer than its nearest side; sides beyond the field do not count.
      let bound = Number.POSITIVE_INFINITY;
      if (x0 > 0) bound = Math.min(bound, qx - this.minX - x0 * edge);
      if (x1 < countX - 1) bound = Math.min(bound, this.minX + (x1 + 1) * edge - qx);
      if (y0 > 0) bound = Math.min(bound, qy - this.minY - y0 * edge);
      if (y1 < countY - 1) bound = Math.min(bound, this.minY + (y1 + 1) * edge - qy);
      if (dims === 3) {
        if (z0 > 0) bound = Math.min(bound, qz - this.minZ - z0 * edge);
        if (z1 < countZ - 1) bound = Math.min(bound, this.minZ + (z1 + 1) * edge - qz);
      }
      if (bound === Number.POSITIVE_INFINITY) return found;
      // A hair less than the bound, so that rounding of the cell borders can hide no point.
      const safe = bound * (1 - 1e-9);
      if (found === k && square[k - 1]! <= safe * safe) return found;
    }
  }

  /** Looks at the cells of one ring (the first includes the centre); returns the neighbours held. */
  private takeRing(
    ring: number,
    cx: number,
    cy: number,
    cz: number,
    own: number,
    qx: number,
    qy: number,
    qz: number,
    held: number,
  ): number {
    const { start, countX, countY, countZ, dims } = this;
    const deep = dims === 3;
    const z0 = deep ? Math.max(0, cz - ring) : 0;
    const z1 = deep ? Math.min(countZ - 1, cz + ring) : 0;
    const y0 = Math.max(0, cy - ring);
    const y1 = Math.min(countY - 1, cy + ring);
    const x0 = Math.max(0, cx - ring);
    const x1 = Math.min(countX - 1, cx + ring);
    let found = held;
    for (let c = z0; c <= z1; c++) {
      for (let b = y0; b <= y1; b++) {
        const line = (c * countY + b) * countX;
        const face = ring === 1 || b === cy - ring || b === cy + ring || (deep && (c === cz - ring || c === cz + ring));
        if (face) {
          found = this.takeSlots(start[line + x0]!, start[line + x1 + 1]!, own, qx, qy, qz, found);
          continue;
        }
        if (cx - ring >= 0)
          found = this.takeSlots(start[line + cx - ring]!, start[line + cx - ring + 1]!, own, qx, qy, qz, found);
        if (cx + ring < countX)
          found = this.takeSlots(start[line + cx + ring]!, start[line + cx + ring + 1]!, own, qx, qy, qz, found);
      }
    }
    return found;
  }

  private takeSlots(from: number, to: number, own: number, qx: number, qy: number, qz: number, held: number): number {
    const { px, py, pz, rows, square, slotRow, k } = this;
    const deep = this.dims === 3;
    let found = held;
    for (let slot = from; slot < to; slot++) {
      if (slot === own) continue;
      const dx = px[slot]! - qx;
      const dy = py[slot]! - qy;
      let d = dx * dx + dy * dy;
      if (deep) {
        const dz = pz[slot]! - qz;
        d += dz * dz;
      }
      let at: number;
      if (found < k) at = found++;
      else if (d < square[k - 1]!) at = k - 1;
      else continue;
      while (at > 0 && square[at - 1]! > d) {
        square[at] = square[at - 1]!;
        rows[at] = rows[at - 1]!;
        at--;
      }
      square[at] = d;
      rows[at] = slotRow[slot]!;
    }
    return found;
  }

  private grow(count: number): void {
    const size = Math.ceil(count * 1.25) + 16;
    this.slotRow = new Uint32Array(size);
    this.slotOf = new Uint32Array(size);
    this.cellOf = new Uint32Array(size);
    this.px = new Float64Array(size);
    this.py = new Float64Array(size);
    this.pz = new Float64Array(size);
  }
}

function cells(extent: number, edge: number): number {
  return Math.trunc(extent / edge) + 1;
}

/**
 * Cell edge for about `wanted` cells: starts from the longest side and halves until there are enough. Halving
 * instead of a root: the same bits everywhere, and scaling by a power of two scales the edge exactly. The last step
 * takes three quarters where that comes nearer.
 */
function cellEdge(extents: readonly number[], wanted: number): number {
  let edge = 0;
  for (const extent of extents) if (extent > edge) edge = extent;
  if (!(edge > 0)) return 1;
  const total = (size: number) => extents.reduce((product, extent) => product * cells(extent, size), 1);
  while (total(edge / 2) <= wanted) edge /= 2;
  return total(edge * 0.75) <= wanted ? edge * 0.75 : edge;
}
