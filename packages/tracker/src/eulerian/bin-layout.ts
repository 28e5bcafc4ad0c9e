import type { Dims } from '../core/columns.js';

/**
 * Where the sums of one bin lie: `stride` doubles a bin, so that a sample touches one short stretch of memory.
 *
 * - samples, pathlines, and the number of the pathline that came last
 * - mean and centred products (Welford) of the velocity components
 * - sums of their squared standard errors
 * - first sample's velocity: a shift for the sums below
 * - sums over the samples of the current pathline: count, shifted components, their products
 * - sums over pathlines of products of those sums, for standard errors that respect that samples of one pathline
 *   go together (see `moments.ts`)
 */
export interface BinLayout {
  readonly dims: Dims;
  readonly stride: number;
  readonly samples: number;
  readonly pathlines: number;
  readonly lastPathline: number;
  readonly mean: number;
  /** uu, uv, (uw), vv, (vw, ww): index of (a, b), a <= b, from `pair`. */
  readonly product: number;
  readonly squaredSe: number;
  readonly shift: number;
  /** 1 + D + D (D + 1) / 2 entries: count, sums, sums of products. */
  readonly current: number;
  /** Per component: sum of S_a^2, S_a n; per pair the six or ten products it needs; first the sum of n^2. */
  readonly clusters: number;
  /** Sum over pathlines of n^3, n their samples in the bin. */
  readonly cubes: number;
  /** Components of each pair, in the order of `product`. */
  readonly pairs: readonly (readonly [number, number])[];
}

/** Entries of `clusters` a pair: S_ab n, S_ab S_a, S_ab S_b, S_ab^2. */
export const PAIR_ENTRIES = 4;

export function binLayout(dims: Dims): BinLayout {
  const pairs: [number, number][] = [];
  for (let a = 0; a < dims; a++) for (let b = a; b < dims; b++) pairs.push([a, b]);
  let next = 0;
  const take = (entries: number): number => {
    const at = next;
    next += entries;
    return at;
  };
  const samples = take(1);
  const pathlines = take(1);
  const lastPathline = take(1);
  const mean = take(dims);
  const product = take(pairs.length);
  const squaredSe = take(dims);
  const shift = take(dims);
  const current = take(1 + dims + pairs.length);
  // n n, then n S_a, then S_a S_b, then four for each pair.
  const clusters = take(1 + dims + pairs.length + PAIR_ENTRIES * pairs.length);
  const cubes = take(1);
  return {
    dims,
    stride: next,
    samples,
    pathlines,
    lastPathline,
    mean,
    product,
    squaredSe,
    shift,
    current,
    clusters,
    cubes,
    pairs,
  };
}
