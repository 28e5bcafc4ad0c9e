import type { Dims } from '../core/columns.js';
import { cubeRoot } from './cube-root.js';
import type { PointColumns } from './neighbour-search.js';

/**
 * Scattered points sorted into square (cubic) cells of a stated mean number of points. Cells follow from the points
 * alone. Points are numbered anew by cell, so that neighbours lie close together in memory: such a number is a slot.
 * Within a cell slots keep the order of the candidates. Mutable: buffers are kept between builds.
 */
export class PointCells {
  dims: Dims = 2;
  /** Row of each slot. */
  rowOf = new Uint32Array(0);
  /** Slot of each candidate. */
  slotOf = new Uint32Array(0);
  /** Points by slot. */
  px = new Float64Array(0);
  py = new Float64Array(0);
  pz = new Float64Array(0);
  protected edge = 1;
  protected minX = 0;
  protected minY = 0;
  protected minZ = 0;
  protected countX = 1;
  protected countY = 1;
  protected countZ = 1;
  /** First slot of each cell, and one past the last; x runs fastest. */
  protected start = new Uint32Array(2);
  protected cellOfSlot = new Uint32Array(0);
  private cellOf = new Uint32Array(0);

  /** Takes the points `points[candidates[0 .. count - 1]]`, all finite, about `perCell` to a cell. Cost O(count). */
  protected sort(points: PointColumns, candidates: Uint32Array, count: number, dims: Dims, perCell: number): void {
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
    const edge = cellEdge(extents, count / perCell);
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
