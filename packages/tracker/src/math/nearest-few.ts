import type { Dims } from '../core/columns.js';
import { cubeRoot } from './cube-root.js';
import type { PointColumns } from './neighbour-search.js';

/** Points a cell should hold on average: measured best near 2 for eight neighbours in the plane. */
const POINTS_PER_CELL = 2;

/** A hair below 1: squared distances to borders of cells are shrunk by it, so that rounding can hide no point. */
const ROUNDING = 1 - 1e-9;

/**
 * The k nearest other points of each point, among scattered points without a given reach. Square (cubic) cells with
 * one or two points each; cells are looked at in growing rings until no closer point can lie outside, so the answer is
 * exact. Cells follow from the points alone. At equal distance the point met first in cell order counts as nearer.
 * Cost for k = 8: about 0.3 us a query in the plane. Mutable: one a user; buffers are kept between builds.
 */
export class NearestFew {
  /** Slots of the neighbours of the last query, nearest first; see `rowOf`. [k] */
  readonly slots: Uint32Array;
  /** Row of each slot: points in cell order, so that neighbours lie close together in memory. */
  rowOf = new Uint32Array(0);
  private readonly k: number;
  private readonly square: Float64Array;
  dims: Dims = 2;
  private edge = 1;
  private minX = 0;
  private minY = 0;
  private minZ = 0;
  private countX = 1;
  private countY = 1;
  private countZ = 1;
  private start = new Uint32Array(2);
  /** Slot of each candidate. */
  slotOf = new Uint32Array(0);
  private cellOf = new Uint32Array(0);
  private cellOfSlot = new Uint32Array(0);
  /** Points by slot. */
  px = new Float64Array(0);
  py = new Float64Array(0);
  pz = new Float64Array(0);

  constructor(k: number) {
    this.k = k;
    this.slots = new Uint32Array(k);
    this.square = new Float64Array(k);
  }

  /** Takes the points `points[candidates[0 .. count - 1]]`, all finite. Cost O(count). */
  build(points: PointColumns, candidates: Uint32Array, count: number, dims: Dims): void {
    this.dims = dims;
    if (this.rowOf.length < count) this.grow(count);
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
    const { start, cellOf, cellOfSlot, slotOf, rowOf, px, py, pz, countX, countY } = this;
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
      cellOfSlot[slot] = cell - 1;
      rowOf[slot] = r;
      px[slot] = x[r]!;
      py[slot] = y[r]!;
      if (deep) pz[slot] = z[r]!;
    }
    // start[c + 1] now holds the first slot of cell c: shift back by one.
    for (let cell = 0; cell < total; cell++) start[cell] = start[cell + 1]!;
    start[total] = count;
  }

  /** Finds the neighbours of the point in slot `own`; returns how many there are (k, or all others where there are fewer). */
  near(own: number): number {
    const { px, py, pz, dims, countX, countY, countZ, edge, k, square } = this;
    const qx = px[own]!;
    const qy = py[own]!;
    const qz = dims === 3 ? pz[own]! : 0;
    const cell = this.cellOfSlot[own]!;
    const cx = cell % countX;
    const line = (cell - cx) / countX;
    const cy = line % countY;
    const cz = (line - cy) / countY;
    let found = dims === 2 ? this.takeBlock(cx, cy, own, qx, qy) : 0;
    for (let ring = dims === 2 ? 1 : 0; ; ring++) {
      if (dims === 3 || ring > 1) found = this.takeRing(ring, cx, cy, cz, own, qx, qy, qz, found);
      // No point outside the block of cells is nearer than its nearest side; sides beyond the field do not count.
      let bound = Number.POSITIVE_INFINITY;
      if (cx - ring > 0) bound = qx - this.minX - (cx - ring) * edge;
      if (cx + ring < countX - 1) bound = Math.min(bound, this.minX + (cx + ring + 1) * edge - qx);
      if (cy - ring > 0) bound = Math.min(bound, qy - this.minY - (cy - ring) * edge);
      if (cy + ring < countY - 1) bound = Math.min(bound, this.minY + (cy + ring + 1) * edge - qy);
      if (dims === 3) {
        if (cz - ring > 0) bound = Math.min(bound, qz - this.minZ - (cz - ring) * edge);
        if (cz + ring < countZ - 1) bound = Math.min(bound, this.minZ + (cz + ring + 1) * edge - qz);
      }
      if (bound === Number.POSITIVE_INFINITY) return found;
      if (found === k && bound > 0 && square[k - 1]! <= bound * bound * ROUNDING) return found;
    }
  }

  /** Rings 0 and 1 in the plane, where nearly every query ends: the middle line of cells first, so that the others mostly bring nothing. */
  private takeBlock(cx: number, cy: number, own: number, qx: number, qy: number): number {
    const { start, px, py, slots, square, k, countX, countY } = this;
    const x0 = cx > 0 ? cx - 1 : 0;
    const x1 = cx + 1 < countX ? cx + 2 : countX;
    const last = k - 1;
    let found = 0;
    let worst = Number.POSITIVE_INFINITY;
    for (let turn = 0; turn < 3; turn++) {
      const b = turn === 0 ? cy : turn === 1 ? cy - 1 : cy + 1;
      if (b < 0 || b >= countY) continue;
      const to = start[b * countX + x1]!;
      for (let slot = start[b * countX + x0]!; slot < to; slot++) {
        const dx = px[slot]! - qx;
        const dy = py[slot]! - qy;
        const d = dx * dx + dy * dy;
        if (d >= worst || slot === own) continue;
        let at = found < k ? found++ : last;
        while (at > 0 && square[at - 1]! > d) {
          square[at] = square[at - 1]!;
          slots[at] = slots[at - 1]!;
          at--;
        }
        square[at] = d;
        slots[at] = slot;
        if (found === k) worst = square[last]!;
      }
    }
    return found;
  }

  /** Looks at the cells of one ring (ring 0 is the point's own cell); returns the neighbours held. */
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
    const { start, countX, countY, countZ, dims, k, square, edge } = this;
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
        if (b === cy - ring || b === cy + ring || (deep && (c === cz - ring || c === cz + ring))) {
          if (found === k) {
            // The whole line of cells may lie beyond the farthest neighbour held.
            const dy = b < cy ? qy - this.minY - (b + 1) * edge : b > cy ? this.minY + b * edge - qy : 0;
            const dz = c < cz ? qz - this.minZ - (c + 1) * edge : c > cz ? this.minZ + c * edge - qz : 0;
            if ((dy > 0 ? dy * dy : 0) + (dz > 0 ? dz * dz : 0) > square[k - 1]! * (2 - ROUNDING)) continue;
          }
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
    const { px, py, pz, slots, square, k } = this;
    const deep = this.dims === 3;
    let found = held;
    // Points beyond the k-th so far are turned away by one comparison.
    let worst = found === k ? square[k - 1]! : Number.POSITIVE_INFINITY;
    for (let slot = from; slot < to; slot++) {
      const dx = px[slot]! - qx;
      const dy = py[slot]! - qy;
      let d = dx * dx + dy * dy;
      if (deep) {
        const dz = pz[slot]! - qz;
        d += dz * dz;
      }
      if (d >= worst || slot === own) continue;
      let at = found < k ? found++ : k - 1;
      while (at > 0 && square[at - 1]! > d) {
        square[at] = square[at - 1]!;
        slots[at] = slots[at - 1]!;
        at--;
      }
      square[at] = d;
      slots[at] = slot;
      if (found === k) worst = square[k - 1]!;
    }
    return found;
  }

  private grow(count: number): void {
    const size = Math.ceil(count * 1.25) + 16;
    this.rowOf = new Uint32Array(size);
    this.slotOf = new Uint32Array(size);
    this.cellOf = new Uint32Array(size);
    this.cellOfSlot = new Uint32Array(size);
    this.px = new Float64Array(size);
    this.py = new Float64Array(size);
    this.pz = new Float64Array(size);
  }
}

function cells(extent: number, edge: number): number {
  return Math.trunc(extent / edge) + 1;
}

/** Cell edge for about `wanted` cells over the extents that are not zero. */
function cellEdge(extents: readonly number[], wanted: number): number {
  let longest = 0;
  for (const extent of extents) if (extent > longest) longest = extent;
  if (!(longest > 0)) return 1;
  let volume = 1;
  let axes = 0;
  for (const extent of extents) {
    // A side shorter than one cell counts as one cell.
    if (extent * wanted <= longest) continue;
    volume *= extent / longest;
    axes++;
  }
  const share = wanted > 1 ? volume / wanted : 1;
  const edge = axes === 1 ? share : axes === 2 ? Math.sqrt(share) : cubeRoot(share);
  return longest * edge;
}
