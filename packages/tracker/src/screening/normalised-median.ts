import type { Dims } from '../core/columns.js';
import { medianOfFew } from '../math/median.js';
import { NearestFew } from '../math/nearest-few.js';

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
 * Neighbours `values[0 .. count - 1]` are reordered; `scratch` has at least `count` entries.
 *
 * @example
 * // 1.0 1.1 0.9 1.05 0.95 1.0 1.2 0.8 px round a vector of 2.0 px: 1 / (0.075 + 0.1) = 5.714
 * normalisedMedianResidual(2, Float64Array.of(1, 1.1, 0.9, 1.05, 0.95, 1, 1.2, 0.8), 8, 0.1, new Float64Array(8));
 */
export function normalisedMedianResidual(
  centre: number,
  values: Float64Array,
  count: number,
  epsilon: number,
  scratch: Float64Array,
): number {
  const middle = medianOfFew(values, count);
  for (let i = 0; i < count; i++) scratch[i] = Math.abs(values[i]! - middle);
  return Math.abs(centre - middle) / (medianOfFew(scratch, count) + epsilon);
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
 * The normalised median test on scattered samples: per component, against the `neighbours` nearest samples in space,
 * plain medians (neighbours are the nearest, so weights by distance change little). A sample fails when one
 * component's normalised residual exceeds the threshold; it is not judged with fewer than 4 neighbours or without a
 * velocity. Where more than half the neighbours lie within threshold times epsilon of the sample their median does
 * too, and the sample passes without either median being taken.
 *
 * Exact and the same whatever the cuts: neighbours follow from the candidates of the frame alone. Mutable scratch:
 * one screen a user.
 */
export class MedianScreen {
  private readonly test: MedianTest;
  private readonly search: NearestFew;
  private readonly values: Float64Array;
  private readonly scratch: Float64Array;

  constructor(test: MedianTest) {
    this.test = test;
    this.search = new NearestFew(test.neighbours);
    this.values = new Float64Array(test.neighbours);
    this.scratch = new Float64Array(test.neighbours);
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
    const { search, test } = this;
    search.build(columns, candidates, count, columns.dims);
    const { root } = columns;
    let failed = 0;
    for (let i = 0; i < judged; i++) {
      const row = candidates[i]!;
      const found = search.near(i);
      if (found < FEWEST_NEIGHBOURS) continue;
      const speed =
        Math.abs(columns.u[row]!) + Math.abs(columns.v[row]!) + (columns.dims === 3 ? Math.abs(columns.w[row]!) : 0);
      const floor = speed * ROUNDING_SHARE;
      const gain = root[row]!;
      const bad =
        this.fails(columns.u, row, found, floor + (test.epsilon ?? gain * test.noise[0])) ||
        this.fails(columns.v, row, found, floor + (test.epsilon ?? gain * test.noise[1])) ||
        (columns.dims === 3 && this.fails(columns.w, row, found, floor + (test.epsilon ?? gain * test.noise[2])));
      if (bad) {
        flags[row] = flags[row]! | bit;
        failed++;
      }
    }
    return failed;
  }

  private fails(velocity: Float32Array, row: number, found: number, epsilon: number): boolean {
    const { values, search } = this;
    const near = search.rows;
    const threshold = this.test.threshold;
    const centre = velocity[row]!;
    const close = threshold * epsilon;
    let within = 0;
    for (let i = 0; i < found; i++) {
      const value = velocity[near[i]!]!;
      values[i] = value;
      if (Math.abs(value - centre) <= close) within++;
    }
    if (within > found >>> 1) return false;
    return normalisedMedianResidual(centre, values, found, epsilon, this.scratch) > threshold;
  }
}
