import type { BinLayout } from './bin-layout.js';
import { PAIR_ENTRIES } from './bin-layout.js';
import { closePathline } from './close-pathline.js';

/** Figures of one bin in double precision; NaN where there are too few samples for any. */
export interface BinMoments {
  readonly samples: number;
  readonly pathlines: number;
  /** Pathlines of equal length that would weigh as much: N^2 over the sum of n_g^2 (L. Kish, Survey Sampling (1965), from memory). */
  readonly effectivePathlines: number;
  /** Mean of u, v, (w). */
  readonly mean: readonly number[];
  /** Standard error of each mean, samples of one pathline taken as going together; NaN with fewer than 2 pathlines. */
  readonly meanSe: readonly number[];
  /** Components of each stress: [0, 0] for uu, [0, 1] for uv ... */
  readonly pairs: readonly (readonly [number, number])[];
  /**
   * Covariances, free of bias: with one sample a pathline (or one pathline only) the sum of products of deviations over
   * samples - 1; else see `momentsOf`.
   */
  readonly product: readonly number[];
  readonly productSe: readonly number[];
  /** Mean squared standard error of the velocity per component: the noise part of the variance. */
  readonly noise: readonly number[];
}

/**
 * Takes the figures of a bin from its sums. Standard errors are those of a mean over clusters: with S_g the sum over
 * the samples of pathline g of their deviations from the mean of the bin, var(mean) = F sum(S_g^2) / N^2, N samples of
 * G pathlines (K.-Y. Liang & S. L. Zeger, Biometrika 73 (1986) 13-22, for a mean; from memory). Samples
 * of one pathline may be correlated in any way; different pathlines are taken as independent. F takes off the bias of
 * few pathlines of unequal length: with p_g = n_g / N the share of pathline g, the expectation of sum(S_g^2) / N^2 for
 * samples that are the same along each pathline is var(mean) (1 - 2 sum(p_g^3) / sum(p_g^2) + sum(p_g^2)), which is
 * G / (G - 1) of equal shares. For samples that are less alike F is a little too large, never too small.
 *
 * The mean of products of deviations is too small by the (co)variance of the means that were taken off: that, estimated
 * in the same way, is added back. For a stress's standard error the deviations are those of the product of fluctuations.
 * With one sample a pathline all of it reduces to the plain s^2 with N - 1 and to s / sqrt(N).
 */
export function momentsOf(layout: BinLayout, sums: Float64Array, bin: number): BinMoments {
  const { dims, pairs, stride } = layout;
  const bins = sums.subarray(bin * stride, (bin + 1) * stride);
  const closed = bins.slice();
  closePathline(layout, bins, 0, closed);
  const n = closed[layout.samples]!;
  const pathlines = closed[layout.pathlines]!;
  const nn = closed[layout.clusters]!;
  const bias = 1 - (2 * closed[layout.cubes]!) / (nn * n) + nn / (n * n);
  const factor = pathlines > 1 ? 1 / (bias * n * n) : Number.NaN;
  const plain = pathlines < 2 || pathlines === n;
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
    // Deviation sum of pathline g: S_ab - ma S_b - mb S_a + n c, squared and summed.
    const c = ma * mb - raw / n;
    const at = four + PAIR_ENTRIES * k;
    const sabN = closed[at]!;
    const sabA = closed[at + 1]!;
    const sabB = closed[at + 2]!;
    const sabSab = closed[at + 3]!;
    const ab = closed[two + k]!;
    const ofMeans = factor * (ab - ma * nB - mb * nA + ma * mb * nn);
    product.push(n > 1 ? (plain ? raw / (n - 1) : raw / n + ofMeans) : Number.NaN);
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
  return { samples: n, pathlines, effectivePathlines: (n * n) / nn, mean, meanSe, pairs, product, productSe, noise };
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
