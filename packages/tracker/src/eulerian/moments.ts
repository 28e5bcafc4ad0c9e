import type { BinLayout } from './bin-layout.js';
import { PAIR_ENTRIES } from './bin-layout.js';
import { closePathline } from './close-pathline.js';

/** Figures of one bin in double precision; NaN where there are too few samples for any. */
export interface BinMoments {
  readonly samples: number;
  readonly pathlines: number;
  /** Mean of u, v, (w). */
  readonly mean: readonly number[];
  /** Standard error of each mean, samples of one pathline taken as going together; NaN with fewer than 2 pathlines. */
  readonly meanSe: readonly number[];
  /** Components of each stress: [0, 0] for uu, [0, 1] for uv ... */
  readonly pairs: readonly (readonly [number, number])[];
  /** Sum of products of deviations over samples - 1. */
  readonly product: readonly number[];
  readonly productSe: readonly number[];
  /** Mean squared standard error of the velocity per component: the noise part of the variance. */
  readonly noise: readonly number[];
}

/**
 * Takes the figures of a bin from its sums. Standard errors are those of a mean over clusters: with S_g the sum over
 * the samples of pathline g of their deviations from the mean of the bin, var(mean) = G / (G - 1) sum(S_g^2) / N^2,
 * N samples of G pathlines (K.-Y. Liang & S. L. Zeger, Biometrika 73 (1986) 13-22, for a mean; from memory). Samples
 * of one pathline may be correlated in any way; different pathlines are taken as independent. For a stress the
 * deviations are those of the product of fluctuations; that the means in it are themselves estimated is neglected,
 * an error of relative size 1 / N. With one sample a pathline both reduce to s / sqrt(N).
 */
export function momentsOf(layout: BinLayout, sums: Float64Array, bin: number): BinMoments {
  const { dims, pairs, stride } = layout;
  const bins = sums.subarray(bin * stride, (bin + 1) * stride);
  const closed = bins.slice();
  closePathline(layout, bins, 0, closed);
  const n = closed[layout.samples]!;
  const pathlines = closed[layout.pathlines]!;
  const factor = pathlines > 1 ? pathlines / (pathlines - 1) / (n * n) : Number.NaN;
  const nn = closed[layout.clusters]!;
  const withN = layout.clusters + 1;
  const two = withN + dims;
  const four = two + pairs.length;
  /** Means from the shift on. */
  const mean: number[] = [];
  const shifted: number[] = [];
  for (let a = 0; a < dims; a++) {
    mean.push(n > 0 ? closed[layout.mean + a]! : Number.NaN);
    shifted.push(closed[layout.mean + a]! - closed[layout.shift + a]!);
  }
  const meanSe: number[] = [];
  const product: number[] = [];
  const productSe: number[] = [];
  for (let k = 0; k < pairs.length; k++) {
    const [a, b] = pairs[k]!;
    const ma = shifted[a]!;
    const mb = shifted[b]!;
    const squareA = closed[two + pairIndex(dims, a, a)]!;
    const squareB = closed[two + pairIndex(dims, b, b)]!;
    const nA = closed[withN + a]!;
    const nB = closed[withN + b]!;
    if (a === b) meanSe.push(rootOf(factor * (squareA - 2 * ma * nA + ma * ma * nn)));
    const raw = closed[layout.product + k]!;
    product.push(n > 1 ? raw / (n - 1) : Number.NaN);
    // Deviation sum of pathline g: S_ab - ma S_b - mb S_a + n c, squared and summed.
    const c = ma * mb - raw / n;
    const at = four + PAIR_ENTRIES * k;
    const sabN = closed[at]!;
    const sabA = closed[at + 1]!;
    const sabB = closed[at + 2]!;
    const sabSab = closed[at + 3]!;
    const ab = closed[two + k]!;
    const square =
      sabSab +
      ma * ma * squareB +
      mb * mb * squareA +
      c * c * nn -
      2 * ma * sabB -
      2 * mb * sabA +
      2 * c * sabN +
      2 * ma * mb * ab -
      2 * ma * c * nB -
      2 * mb * c * nA;
    productSe.push(rootOf(factor * square));
  }
  const noise: number[] = [];
  for (let a = 0; a < dims; a++) noise.push(n > 0 ? closed[layout.squaredSe + a]! / n : Number.NaN);
  return { samples: n, pathlines, mean, meanSe, pairs, product, productSe, noise };
}

/** Place of pair (a, b), a <= b, among uu, uv, (uw), vv, (vw, ww). */
function pairIndex(dims: number, a: number, b: number): number {
  let index = 0;
  for (let row = 0; row < a; row++) index += dims - row;
  return index + b - a;
}

/** Square root of a variance that rounding may have brought a hair below zero. */
function rootOf(variance: number): number {
  return variance > 0 ? Math.sqrt(variance) : variance <= 0 ? 0 : Number.NaN;
}
