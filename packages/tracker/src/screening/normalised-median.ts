import type { Dims } from '../core/columns.js';
import { medianOfFew } from '../math/median.js';
import { NearestFew } from '../math/nearest-few.js';
import { sortEight } from '../math/sort-eight.js';
import { LocalSpread } from './local-spread.js';
import { PlaneTest } from './plane-test.js';

/** Fewest neighbours for a judgement: the median of three has no defence against two outliers. */
export const FEWEST_NEIGHBOURS = 4;

/**
 * Room for rounding in the velocities, as a share of the speed: without it a flow free of noise and gradients would
 * be judged by its last bits. 1e-6 is 8 roundings of single precision, in which velocities are kept.
 */
const ROUNDING_SHARE = 1e-6;

/**
 * Normalised residual of the median test, J. Westerweel & F. Scarano, Exp. Fluids 39 (2005) 1096-1100:
 * |u0 - um| / (rm + epsilon), um the median of the neighbours (centre left out), rm the median of |ui - um|.
 * Neighbours `values[0 .. count - 1]` are put in order.
 *
 * @example
 * // 1.0 1.1 0.9 1.05 0.95 1.0 1.2 0.8 px round a vector of 2.0 px: 1 / (0.075 + 0.1) = 5.714
 * normalisedMedianResidual(2, Float64Array.of(1, 1.1, 0.9, 1.05, 0.95, 1, 1.2, 0.8), 8, 0.1);
 */
export function normalisedMedianResidual(centre: number, values: Float64Array, count: number, epsilon: number): number {
  const middle = medianOfFew(values, count);
  // The values are in order now: their distances from the middle come in order too, from the middle outwards.
  const half = count >>> 1;
  let low = half - 1;
  let high = half;
  let before = 0;
  let distance = 0;
  for (let rank = 0; rank <= half; rank++) {
    before = distance;
    const below = low >= 0 ? middle - values[low]! : Number.POSITIVE_INFINITY;
    const above = high < count ? values[high]! - middle : Number.POSITIVE_INFINITY;
    if (below < above) {
      distance = below;
      low--;
    } else {
      distance = above;
      high++;
    }
  }
  const spread = count % 2 === 1 ? distance : (before + distance) / 2;
  return Math.abs(centre - middle) / (spread + epsilon);
}

/** Room for rounding in what stands in for the test, as a share of the deviation: some thousand roundings. */
const ROOM = 1e-12;

/**
 * True where the published test surely passes against eight neighbours `values[slots[base .. base + 7]]`: without the second
 * median, for it lies at least as high as a bound that at most three distances from the first stay below. False where
 * that does not show it, which says nothing. `sorted`: scratch of 8.
 */
export function surelyPassesEight(
  values: Float64Array,
  slots: Int32Array,
  base: number,
  centre: number,
  epsilon: number,
  threshold: number,
  sorted: Float64Array,
): boolean {
  const a = values[slots[base]!]!;
  const b = values[slots[base + 1]!]!;
  const c = values[slots[base + 2]!]!;
  const d = values[slots[base + 3]!]!;
  const e = values[slots[base + 4]!]!;
  const f = values[slots[base + 5]!]!;
  const g = values[slots[base + 6]!]!;
  const h = values[slots[base + 7]!]!;
  sortEight(a, b, c, d, e, f, g, h, sorted);
  const middle = (sorted[3]! + sorted[4]!) / 2;
  // Passes where |centre - middle| <= threshold (spread + epsilon).
  const least = (Math.abs(centre - middle) / threshold) * (1 + ROOM) - epsilon;
  const below =
    Number(Math.abs(a - middle) < least) +
    Number(Math.abs(b - middle) < least) +
    Number(Math.abs(c - middle) < least) +
    Number(Math.abs(d - middle) < least) +
    Number(Math.abs(e - middle) < least) +
    Number(Math.abs(f - middle) < least) +
    Number(Math.abs(g - middle) < least) +
    Number(Math.abs(h - middle) < least);
  return below <= 3;
}

/** Samples of a window as columns by row; borrowed. */
export interface VelocityColumns {
  readonly dims: Dims;
  /** Measured positions. */
  readonly x: Float64Array;
  readonly y: Float64Array;
  readonly z: Float64Array;
  readonly u: Float32Array;
  readonly v: Float32Array;
  readonly w: Float32Array;
  /** Standard error of the velocity over that of the position, per time. */
  readonly root: Float32Array;
}

export interface MedianTest {
  readonly threshold: number;
  readonly neighbours: number;
  /** Velocity noise per component; null: standard error of the judged sample. */
  readonly epsilon: number | null;
  /** Position noise per axis, for that standard error. */
  readonly noise: readonly [number, number, number];
}

/**
 * The normalised median test on scattered samples, per component, against the `neighbours` nearest samples in space.
 * A sample fails when one component does; it is not judged with fewer than 4 neighbours or without a velocity.
 *
 * The published test takes its neighbours from a regular grid, where they lie evenly round the centre. Scattered ones
 * do not, so that in plain shear without any noise one sample in twenty would fail. Hence a component that fails the
 * published test is tested again on what is left after the plane through the neighbours (`PlaneTest`), and fails only
 * if it fails there too. With too few neighbours for that the published test decides. What has failed must also stand
 * out of the spread round its neighbours (`LocalSpread`), so that turbulence which the seeding does not resolve is left
 * in.
 *
 * Nearly every sample is seen to pass by a bound on the second median (`surelyPassesEight`), component by component; the
 * tests themselves are made for the rest. Exact and the same whatever the cuts: neighbours follow from the candidates of
 * the frame alone. Mutable scratch: one screen a user. Cost about 0.3 us a sample in the plane and 0.6 us in space, two
 * thirds of it the search for neighbours.
 */
export class MedianScreen {
  private readonly test: MedianTest;
  private readonly search: NearestFew;
  private readonly plane: PlaneTest;
  private readonly local: LocalSpread;
  private readonly values: Float64Array;
  private readonly sorted = new Float64Array(8);
  /** How far each component of the judged sample is off, NaN where it passes. */
  private readonly deviation = new Float64Array(3);
  /** By slot of the search: velocity, and what its standard error is a multiple of. */
  private velocity: [Float64Array, Float64Array, Float64Array];
  private root = new Float64Array(0);
  private floor = new Float64Array(0);
  /** By slot: row of a sample that is judged, -1 for one that is a neighbour only. */
  private judgedRow = new Int32Array(0);
  /** By slot: bits of the components that do not surely pass. */
  private open = new Uint8Array(0);

  constructor(test: MedianTest) {
    this.test = test;
    this.search = new NearestFew(test.neighbours);
    this.plane = new PlaneTest(this.search, test.neighbours);
    this.local = new LocalSpread(this.search, this.plane, test.neighbours);
    this.values = new Float64Array(test.neighbours);
    this.velocity = [this.root, this.root, this.root];
  }

  /**
   * Judges `candidates[0 .. judged - 1]` (rows) against all of `candidates[0 .. count - 1]`, each a different
   * pathline; sets `bit` in `flags[row]` of those that fail and returns how many do.
   */
  judge(
    columns: VelocityColumns,
    candidates: Uint32Array,
    count: number,
    judged: number,
    flags: Uint8Array,
    bit: number,
  ): number {
    if (count <= FEWEST_NEIGHBOURS) return 0;
    const { search, open, dims } = this.take(columns, candidates, count, judged);
    for (let slot = 0; slot < count; slot++) {
      // Not judged: too few neighbours.
      if (this.judgedRow[slot]! >= 0 && search.near(slot) < FEWEST_NEIGHBOURS) this.judgedRow[slot] = -1;
    }
    for (let c = 0; c < dims; c++) this.sift(c, count);
    let failed = 0;
    for (let slot = 0; slot < count; slot++) {
      if (open[slot] === 0 || !this.fails(slot, dims)) continue;
      const row = this.judgedRow[slot]!;
      flags[row] = flags[row]! | bit;
      failed++;
    }
    return failed;
  }

  /** Leaves open those judged samples whose component c does not surely pass. */
  private sift(c: number, count: number): void {
    const { judgedRow, open, sorted, search } = this;
    const { slots, k } = search;
    const { threshold } = this.test;
    const velocity = this.velocity[c]!;
    const bit = 1 << c;
    for (let slot = 0; slot < count; slot++) {
      if (judgedRow[slot]! < 0) continue;
      // Known by now: no search.
      const eight = search.near(slot) === 8;
      const epsilon = this.epsilon(c, slot);
      if (eight && surelyPassesEight(velocity, slots, k * slot, velocity[slot]!, epsilon, threshold, sorted)) continue;
      open[slot] = open[slot]! | bit;
    }
  }

  /** Decides about a sample by its open components. */
  private fails(slot: number, dims: Dims): boolean {
    const { search, deviation, open } = this;
    const found = search.near(slot);
    let off = false;
    for (let c = 0; c < 3; c++) {
      const tested = c < dims && (open[slot]! & (1 << c)) !== 0;
      deviation[c] = tested ? this.off(this.velocity[c]!, slot, found, this.epsilon(c, slot)) : Number.NaN;
      if (deviation[c]! >= 0) off = true;
    }
    return off && this.local.standsOut(this.velocity, slot, found, deviation);
  }

  /** Noise of component c of a sample, with room for rounding. */
  private epsilon(c: number, slot: number): number {
    const { epsilon, noise } = this.test;
    return this.floor[slot]! + (epsilon ?? this.root[slot]! * noise[c]!);
  }

  /** Sorts the candidates into cells and takes their velocities along. */
  private take(
    columns: VelocityColumns,
    candidates: Uint32Array,
    count: number,
    judged: number,
  ): { readonly search: NearestFew; readonly open: Uint8Array; readonly dims: Dims } {
    const { search } = this;
    search.build(columns, candidates, count, columns.dims);
    this.gather(columns, candidates, count, judged);
    return { search, open: this.open, dims: columns.dims };
  }

  private gather(columns: VelocityColumns, candidates: Uint32Array, count: number, judged: number): void {
    if (this.root.length < count) {
      const size = Math.ceil(count * 1.25);
      this.root = new Float64Array(size);
      this.floor = new Float64Array(size);
      this.open = new Uint8Array(size);
      this.judgedRow = new Int32Array(size);
      this.velocity = [new Float64Array(size), new Float64Array(size), new Float64Array(columns.dims === 3 ? size : 0)];
    }
    const { root, floor, open, judgedRow } = this;
    const { slotOf } = this.search;
    const [u, v, w] = this.velocity;
    const deep = columns.dims === 3;
    for (let i = 0; i < count; i++) {
      const row = candidates[i]!;
      const slot = slotOf[i]!;
      u[slot] = columns.u[row]!;
      v[slot] = columns.v[row]!;
      if (deep) w[slot] = columns.w[row]!;
      root[slot] = columns.root[row]!;
      const speed = Math.abs(u[slot]!) + Math.abs(v[slot]!) + (deep ? Math.abs(w[slot]!) : 0);
      floor[slot] = speed * ROUNDING_SHARE;
      open[slot] = 0;
      judgedRow[slot] = i < judged ? row : -1;
    }
  }

  /** Distance of a component from what its neighbours imply, NaN where it passes. */
  private off(velocity: Float64Array, slot: number, found: number, epsilon: number): number {
    const { values } = this;
    const { slots } = this.search;
    const threshold = this.test.threshold;
    const centre = velocity[slot]!;
    const base = this.search.k * slot;
    const close = threshold * epsilon;
    let within = 0;
    for (let i = 0; i < found; i++) {
      const value = velocity[slots[base + i]!]!;
      values[i] = value;
      if (Math.abs(value - centre) <= close) within++;
    }
    if (within > found >>> 1) return Number.NaN;
    if (normalisedMedianResidual(centre, values, found, epsilon) <= threshold) return Number.NaN;
    if (this.plane.residual(velocity, slot, found, epsilon) <= threshold) return Number.NaN;
    // From their median (`values` stand in order now) or from their plane, whichever is less: a gradient widens the one,
    // neighbours that lie to one side the other.
    const half = found >>> 1;
    const middle = found % 2 === 1 ? values[half]! : (values[half - 1]! + values[half]!) / 2;
    const { deviation } = this.plane;
    const fromMedian = Math.abs(centre - middle);
    return Number.isNaN(deviation) ? fromMedian : Math.min(deviation, fromMedian);
  }
}
