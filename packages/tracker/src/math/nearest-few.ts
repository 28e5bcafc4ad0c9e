import type { Dims } from '../core/columns.js';
import type { PointColumns } from './neighbour-search.js';
import { Ranking } from './ranking.js';
import { RingSearch, ROUNDING } from './ring-search.js';

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
 * Cost for k = 8: about 0.2 us a point in the plane, 0.4 us in space. Memory: 4 k + 50 bytes a point. Mutable: one a user;
 * buffers are kept between builds.
 */
export class NearestFew extends RingSearch {
  readonly k: number;
  /** Slots of the neighbours of each point that was asked for, nearest first: those of slot s from k s on. */
  slots = new Int32Array(0);
  /** How many there are; -1 for a point that was not asked for yet. */
  private found = new Int32Array(0);
  /** Points that the guessed radius should hold: P(fewer than k) is then about 1 in 8. */
  private readonly aim: number;
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
  }

  /** Takes the points `points[candidates[0 .. count - 1]]`, all finite. Cost O(count). */
  build(points: PointColumns, candidates: Uint32Array, count: number, dims: Dims): void {
    // A cell as wide as the radius that should hold what is aimed at, and the point itself.
    this.sort(points, candidates, count, dims, (this.aim + 1) / BALL[dims]);
    this.blockCell = -1;
    if (this.found.length < count) {
      const size = Math.ceil(1.25 * count);
      this.found = new Int32Array(size);
      this.slots = new Int32Array(size * this.k);
    }
    this.found.fill(-1, 0, count);
  }

  /** Finds the neighbours of the point in slot `own`, once; returns how many there are (k, or all others where there are fewer). */
  near(own: number): number {
    const known = this.found[own]!;
    return known >= 0 ? known : this.search(own);
  }

  private search(own: number): number {
    const cell = this.cellOfSlot[own]!;
    if (cell !== this.blockCell) this.gather(cell);
    const { k } = this;
    let found = k;
    if (this.takeWithin(own, this.blockSquare) < k && this.takeWithin(own, this.surely(own)) < k) {
      found = this.nearByRings(own, k, this.slots, k * own);
    }
    this.found[own] = found;
    return found;
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
    return m < this.k || m > MOST_TAKEN ? 0 : this.rankTaken(own, m);
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

  /** Keeps the nearest k of the m points taken, which come by ascending slot. */
  private rankTaken(own: number, m: number): number {
    const { taken, ranked, slots, blockSlot, k } = this;
    const rank = this.ranking.of(this.far, m);
    for (let i = 0; i < m; i++) ranked[rank[i]!] = taken[i]!;
    for (let i = 0; i < k; i++) slots[k * own + i] = blockSlot[ranked[i]!]!;
    return k;
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
