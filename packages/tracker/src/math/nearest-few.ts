import type { Dims } from '../core/columns.js';
import type { PointColumns } from './neighbour-search.js';
import { PointCells } from './point-cells.js';
import { Ranking } from './ranking.js';

/** A hair below 1: squared distances to borders of cells are shrunk by it, so that rounding can hide no point. */
const ROUNDING = 1 - 1e-9;

/** Points taken at most by the quick way, in clusters many lie closer together than the density round them implies. */
const MOST_TAKEN = 48;

/** Points in a block at first. */
const BLOCK = 256;

/** Volume of the ball of radius 1 in the plane and in space. */
const BALL = { 2: Math.PI, 3: (4 / 3) * Math.PI } as const;

/**
 * The k nearest other points of each point, among scattered points without a given reach. Exact; at equal distance the
 * lower slot counts as nearer.
 *
 * Nearly every query is answered from its own cell and those around it, whose points are gathered once for all queries
 * of the cell. A radius is guessed from their density so that it should hold somewhat more than k. Cells are as wide as
 * that radius: whatever lies within it is among the gathered. Points within are taken and ranked by comparing each with
 * each, both without a branch that depends on data: such branches, guessed wrongly half the time, are what a heap or an
 * insertion costs. Where the guess holds too few the radius grows to what the gathered surely cover; where these are too
 * few as well, or too many, cells are looked at in growing rings until no closer point can lie outside.
 *
 * Cost for k = 8: about 0.1 us a query in the plane, 0.2 us in space. Mutable: one a user; buffers are kept between builds.
 */
export class NearestFew extends PointCells {
  /** Slots of the neighbours of the last query, nearest first; see `rowOf`. [k] */
  readonly slots: Uint32Array;
  private readonly k: number;
  /** Points that the guessed radius should hold: P(fewer than k) is then about 1 in 8. */
  private readonly aim: number;
  private readonly square: Float64Array;
  /** Coordinates, one point after the other, of the points of the cells round `blockCell`, by ascending slot. */
  private blockCell = -1;
  private blockCount = 0;
  /** Place of the cell's own first point among them. */
  private blockOwn = 0;
  /** Squared radius that should hold what is aimed at. */
  private blockSquare = 0;
  private block = new Float64Array(3 * BLOCK);
  private blockSlot = new Int32Array(BLOCK);
  /** Points within the radius, as numbers in the block, and their squared distances. */
  private taken = new Int32Array(BLOCK + 2);
  private far = new Float64Array(BLOCK + 2);
  private readonly ranking = new Ranking(MOST_TAKEN);
  private readonly ranked = new Int32Array(MOST_TAKEN + 1);

  constructor(k: number) {
    super();
    this.k = k;
    this.aim = k + 1.25 * Math.sqrt(k);
    this.slots = new Uint32Array(k);
    this.square = new Float64Array(k);
  }

  /** Takes the points `points[candidates[0 .. count - 1]]`, all finite. Cost O(count). */
  build(points: PointColumns, candidates: Uint32Array, count: number, dims: Dims): void {
    // A cell as wide as the radius that should hold what is aimed at, and the point itself.
    this.sort(points, candidates, count, dims, (this.aim + 1) / BALL[dims]);
    this.blockCell = -1;
  }

  /** Finds the neighbours of the point in slot `own`; returns how many there are (k, or all others where there are fewer). */
  near(own: number): number {
    const cell = this.cellOfSlot[own]!;
    if (cell !== this.blockCell) this.gather(cell);
    const { k } = this;
    if (this.takeWithin(own, this.blockSquare) >= k || this.takeWithin(own, this.surely(own)) >= k) return k;
    return this.nearByRings(own);
  }

  /** Gathers the points of a cell and of those around it. */
  private gather(cell: number): void {
    const { start, px, py, pz, countX, countY, countZ, edge } = this;
    const deep = this.dims === 3;
    const cx = cell % countX;
    const line = (cell - cx) / countX;
    const cy = line % countY;
    const cz = (line - cy) / countY;
    const x0 = cx > 0 ? cx - 1 : 0;
    const x1 = cx + 1 < countX ? cx + 2 : countX;
    const y0 = cy > 0 ? cy - 1 : 0;
    const y1 = cy + 1 < countY ? cy + 2 : countY;
    const z0 = cz > 0 ? cz - 1 : 0;
    const z1 = cz + 1 < countZ ? cz + 2 : countZ;
    let { block, blockSlot } = this;
    let n = 0;
    let at = 0;
    for (let c = z0; c < z1; c++) {
      for (let b = y0; b < y1; b++) {
        const first = (c * countY + b) * countX;
        const from = start[first + x0]!;
        const to = start[first + x1]!;
        if (n + to - from > blockSlot.length) {
          this.widen(2 * (n + to - from));
          ({ block, blockSlot } = this);
        }
        if (c === cz && b === cy) this.blockOwn = n + start[cell]! - from;
        for (let slot = from; slot < to; slot++) {
          block[at++] = px[slot]!;
          block[at++] = py[slot]!;
          if (deep) block[at++] = pz[slot]!;
          blockSlot[n++] = slot;
        }
      }
    }
    this.blockCell = cell;
    this.blockCount = n;
    // Radius that holds what is aimed at where the block's mean density is that round the point, but no more than a cell.
    const volume = (x1 - x0) * (y1 - y0) * (z1 - z0);
    const share = (this.aim * volume) / (n * BALL[this.dims]);
    const radius = share >= 1 ? 1 : deep ? cubeRootBelowOne(share) : Math.sqrt(share);
    this.blockSquare = radius * radius * edge * edge * ROUNDING;
  }

  private widen(size: number): void {
    const { block, blockSlot } = this;
    this.block = new Float64Array(3 * size);
    this.blockSlot = new Int32Array(size);
    this.taken = new Int32Array(size + 2);
    this.far = new Float64Array(size + 2);
    this.block.set(block);
    this.blockSlot.set(blockSlot);
  }

  /** Squared radius round a point of the gathered cell that the block surely covers: its nearest side within the field. */
  private surely(own: number): number {
    const { countX, countY, countZ, edge, blockCell } = this;
    const cx = blockCell % countX;
    const line = (blockCell - cx) / countX;
    const cy = line % countY;
    const cz = (line - cy) / countY;
    let bound = side(this.px[own]! - this.minX, cx, countX, edge);
    bound = Math.min(bound, side(this.py[own]! - this.minY, cy, countY, edge));
    if (this.dims === 3) bound = Math.min(bound, side(this.pz[own]! - this.minZ, cz, countZ, edge));
    return bound > 0 ? bound * bound * ROUNDING : 0;
  }

  /** The k nearest points of the block within a squared radius of point `own` are the answer where there are as many. */
  private takeWithin(own: number, within: number): number {
    const m = this.dims === 3 ? this.scanSpace(own, within) : this.scanPlane(own, within);
    return m < this.k || m > MOST_TAKEN ? 0 : this.rankTaken(m);
  }

  // Each loop is a method of its own: together they need more registers than there are, which doubles their time.

  private scanPlane(own: number, within: number): number {
    const { block, taken, far, blockCount } = this;
    const self = (this.blockOwn + own - this.start[this.blockCell]!) | 0;
    const qx = block[2 * self]!;
    const qy = block[2 * self + 1]!;
    let m = 0;
    for (let j = 0; j < blockCount; j++) {
      const dx = block[2 * j]! - qx;
      const dy = block[2 * j + 1]! - qy;
      const d = dx * dx + dy * dy;
      taken[m] = j;
      far[m] = d;
      m = (m + (Number(d <= within) & Number(j !== self))) | 0;
    }
    return m;
  }

  private scanSpace(own: number, within: number): number {
    const { block, taken, far, blockCount } = this;
    const self = (this.blockOwn + own - this.start[this.blockCell]!) | 0;
    const qx = block[3 * self]!;
    const qy = block[3 * self + 1]!;
    const qz = block[3 * self + 2]!;
    let m = 0;
    for (let j = 0; j < blockCount; j++) {
      const dx = block[3 * j]! - qx;
      const dy = block[3 * j + 1]! - qy;
      const dz = block[3 * j + 2]! - qz;
      const d = dx * dx + dy * dy + dz * dz;
      taken[m] = j;
      far[m] = d;
      m = (m + (Number(d <= within) & Number(j !== self))) | 0;
    }
    return m;
  }

  /** Puts the first k of the m points taken, which come by ascending slot, into `slots`. */
  private rankTaken(m: number): number {
    const { taken, ranked, slots, blockSlot, k } = this;
    const rank = this.ranking.of(this.far, m);
    for (let i = 0; i < m; i++) ranked[rank[i]!] = taken[i]!;
    for (let i = 0; i < k; i++) slots[i] = blockSlot[ranked[i]!]!;
    return k;
  }

  /** The same by rings of cells, however the points lie. */
  private nearByRings(own: number): number {
    const { px, py, pz, dims, countX, countY, countZ, edge, k, square } = this;
    const qx = px[own]!;
    const qy = py[own]!;
    const qz = dims === 3 ? pz[own]! : 0;
    const cell = this.cellOfSlot[own]!;
    const cx = cell % countX;
    const line = (cell - cx) / countX;
    const cy = line % countY;
    const cz = (line - cy) / countY;
    let found = 0;
    for (let ring = 0; ; ring++) {
      found = this.takeRing(ring, cx, cy, cz, own, qx, qy, qz, found);
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
    for (let slot = from; slot < to; slot++) {
      const dx = px[slot]! - qx;
      const dy = py[slot]! - qy;
      let d = dx * dx + dy * dy;
      if (deep) {
        const dz = pz[slot]! - qz;
        d += dz * dz;
      }
      if (slot === own || (found === k && (d > square[k - 1]! || (d === square[k - 1]! && slot > slots[k - 1]!))))
        continue;
      let at = found < k ? found++ : k - 1;
      while (at > 0 && (square[at - 1]! > d || (square[at - 1]! === d && slots[at - 1]! > slot))) {
        square[at] = square[at - 1]!;
        slots[at] = slots[at - 1]!;
        at--;
      }
      square[at] = d;
      slots[at] = slot;
    }
    return found;
  }
}

/** Distance of a coordinate in cell `c` from the nearer side of cells c - 1 .. c + 1; infinite where the field ends before. */
function side(offset: number, c: number, count: number, edge: number): number {
  const below = c - 1 > 0 ? offset - (c - 1) * edge : Number.POSITIVE_INFINITY;
  const above = c + 1 < count - 1 ? (c + 2) * edge - offset : Number.POSITIVE_INFINITY;
  return Math.min(below, above);
}

/** Cube root of a number between 0 and 1 to a few per cent, which is enough for a guess: three Newton steps from 1 down. */
function cubeRootBelowOne(share: number): number {
  let root = 1;
  for (let step = 0; step < 3; step++) root = (2 * root + share / (root * root)) / 3;
  return root;
}
