import type { LinkedBlock } from '../core/columns.js';
import { medianOfFew } from '../math/median.js';
import { FitSpace } from './fit-space.js';
import { FitWeights, localWeights } from './local-fit.js';
import { pathlineOrder } from './pathline-order.js';
import { joinBlocks } from './rolling-frames.js';

/**
 * Spans that are tried: below 5 a fit smooths nothing; at 21 the noise of the velocity is down to 0.036 sigma a frame,
 * and the fit stage holds some 110 frames, which is as long as its memory allows.
 */
export const SHORTEST_SPAN = 5;
export const LONGEST_SPAN = 21;

/** Full windows that a span needs to be tried: the mean square over them is then good to sqrt(2 / 200) = 10 %. */
const FEWEST_WINDOWS = 200;

/** And as a share of those of the shortest span: a span that few pathlines fill would mostly be one-sided. */
const LEAST_SHARE = 0.25;

/**
 * A window takes no part where one of its third differences exceeds 3 times what noise makes of it (sigma sqrt(20))
 * plus 4 times their median in the window: that is a wrong link or a displaced position, not a bend of the pathline.
 */
const NOISE_ROOM = 3;
const BEND_ROOM = 4;

/**
 * Length of the shorter fit over the longer. For degree 1 and 2 the bias grows as m^2 and the noise gain falls as
 * m^-3, so noise in the measured B^2 goes as (r^-3 - 1) / (1 - r^2)^2, which is least at r = 0.75.
 */
const SHORTER = 0.75;

/** What a span is expected to cost. */
export interface SpanForecast {
  readonly span: number;
  /** Mean square error of one velocity component, (length per frame interval)^2: part of noise, part of bias. */
  readonly noise: number;
  readonly bias: number;
  readonly windows: number;
}

/**
 * Span for the local fit: the one with the least predicted mean square error of velocity among odd spans 5 to 21.
 * Noise part: noise gain of the velocity times sigma^2. Bias part, measured: over m frames on either side a fit of
 * degree 1 or 2 errs by B c(m), c(m) its answer to t^3 (t^5 for degree 3). Velocities from m and from three quarters of it,
 * over the same samples, differ by B (c(m) - c(0.75 m)) and by noise of known size: the mean square of their difference
 * less the noise gives B^2 on the very time scale of m, without assuming that the motion is a polynomial beyond it.
 * Frames count as even here. With too few full windows even for span 5 the answer is 5.
 *
 * `noise` per axis, NaN where there is no such axis. Deterministic, only + - * / sqrt. Cost about 5 us a sample:
 * give it a few 10 000 detections.
 */
export function chooseSpan(
  blocks: readonly LinkedBlock[],
  noise: readonly [number, number, number],
  order: 1 | 2 | 3,
): number {
  return bestSpan(forecastSpans(blocks, noise, order));
}

/** The span with the least forecast of noise and bias together; 5 where there is none. */
export function bestSpan(forecasts: readonly SpanForecast[]): number {
  let best = SHORTEST_SPAN;
  let least = Number.POSITIVE_INFINITY;
  for (const { span, noise: random, bias } of forecasts) {
    if (random + bias < least) {
      least = random + bias;
      best = span;
    }
  }
  return best;
}

/** The forecast behind `chooseSpan` for every span that the data can fill, shortest first. */
export function forecastSpans(
  blocks: readonly LinkedBlock[],
  noise: readonly [number, number, number],
  order: 1 | 2 | 3,
): SpanForecast[] {
  const joined = joinBlocks(blocks);
  const axes = joined.dims === 3 ? [joined.x, joined.y, joined.z] : [joined.x, joined.y];
  const sigma2 = meanSquare(noise, axes.length);
  const runs = gaplessRuns(joined);
  const forecasts: SpanForecast[] = [];
  for (let m = (SHORTEST_SPAN - 1) / 2; 2 * m + 1 <= LONGEST_SPAN; m++) {
    const one = forecast(runs, axes, noise, order, m);
    if (one.windows < FEWEST_WINDOWS) break;
    if (forecasts.length > 0 && one.windows < LEAST_SHARE * forecasts[0]!.windows) break;
    forecasts.push({ ...one, noise: one.noise * sigma2 });
  }
  return forecasts;
}

/** Rows of successive frames of one pathline, one run after the other. */
interface Runs {
  readonly row: Uint32Array;
  readonly start: readonly number[];
}

function gaplessRuns(window: LinkedBlock): Runs {
  const order = pathlineOrder(window, new FitSpace());
  const frame = new Int32Array(window.pathline.length);
  for (let k = 0; k < window.number.length; k++) {
    frame.fill(window.number[k]!, window.offsets[k]!, window.offsets[k + 1]!);
  }
  const start: number[] = [];
  for (let slot = 0; slot < order.count; slot++) {
    for (let at = order.start[slot]!; at < order.start[slot + 1]!; at++) {
      const first = at === order.start[slot]!;
      if (first || frame[order.row[at]!]! - frame[order.row[at - 1]!]! !== 1) start.push(at);
    }
  }
  start.push(order.row.length);
  return { row: order.row, start };
}

/** Forecast for m samples on either side, noise part per sigma^2. */
function forecast(
  runs: Runs,
  axes: readonly Float64Array[],
  noise: readonly [number, number, number],
  order: 1 | 2 | 3,
  m: number,
): SpanForecast {
  // The shorter fit must have more samples than the degree has coefficients.
  const least = order === 3 ? 2 : 1;
  const shorter = Math.max(least, Math.floor(SHORTER * m));
  const long = velocityWeights(m === shorter ? m + 1 : m, order);
  const short = velocityWeights(shorter, order);
  const wide = (long.length - 1) / 2;
  const power = order === 3 ? 5 : 3;
  const own = velocityWeights(m, order);
  const difference = long.slice();
  for (let j = 0; j < short.length; j++) {
    difference[j + wide - shorter] = difference[j + wide - shorter]! - short[j]!;
  }
  const answer = monomial(difference, power);
  const scale = monomial(own, power) / answer;
  const gain = sumOfSquares(difference);
  let sum = 0;
  let expected = 0;
  let windows = 0;
  const values = new Float64Array(difference.length);
  const sizes = new Float64Array(difference.length);
  for (let run = 0; run + 1 < runs.start.length; run++) {
    const end = runs.start[run + 1]!;
    for (let at = runs.start[run]!; at + difference.length <= end; at++) {
      let used = true;
      let square = 0;
      for (let axis = 0; axis < axes.length && used; axis++) {
        for (let j = 0; j < values.length; j++) values[j] = axes[axis]![runs.row[at + j]!]!;
        if (values.length > 5 && standsOut(values, noise[axis]!, sizes)) used = false;
        const base = values[wide]!;
        let d = 0;
        for (let j = 0; j < values.length; j++) d += difference[j]! * (values[j]! - base);
        square += d * d;
      }
      if (!used) continue;
      sum += square;
      windows++;
    }
  }
  for (let axis = 0; axis < axes.length; axis++) expected += gain * noise[axis]! * noise[axis]!;
  const excess = windows > 0 ? (sum / windows - expected) / axes.length : 0;
  return {
    span: 2 * m + 1,
    noise: sumOfSquares(own),
    bias: excess > 0 ? excess * scale * scale : 0,
    windows,
  };
}

/** Weights of the velocity at the middle of 2 m + 1 even samples, per frame. */
function velocityWeights(m: number, order: number): Float64Array {
  const count = 2 * m + 1;
  const weights = new FitWeights(count);
  const offsets = new Float64Array(count);
  for (let j = 0; j < count; j++) offsets[j] = j - m;
  localWeights(offsets, count, order, 1, weights, new Float64Array(2 * count));
  return weights.velocity;
}

/** Sum of weights times t^power, t counted from the middle. */
function monomial(weights: Float64Array, power: number): number {
  const m = (weights.length - 1) / 2;
  let sum = 0;
  for (let j = 0; j < weights.length; j++) {
    let term = 1;
    for (let k = 0; k < power; k++) term *= j - m;
    sum += weights[j]! * term;
  }
  return sum;
}

function standsOut(values: Float64Array, sigma: number, sizes: Float64Array): boolean {
  const count = values.length - 3;
  let largest = 0;
  for (let j = 0; j < count; j++) {
    const size = Math.abs(values[j + 3]! - values[j]! - 3 * (values[j + 2]! - values[j + 1]!));
    sizes[j] = size;
    if (size > largest) largest = size;
  }
  const room = NOISE_ROOM * Math.sqrt(20) * sigma;
  if (largest <= room) return false;
  return largest > room + BEND_ROOM * medianOfFew(sizes, count);
}

function sumOfSquares(values: Float64Array): number {
  let sum = 0;
  for (const value of values) sum += value * value;
  return sum;
}

function meanSquare(noise: readonly [number, number, number], axes: number): number {
  let sum = 0;
  for (let axis = 0; axis < axes; axis++) sum += noise[axis]! * noise[axis]!;
  return sum / axes;
}
