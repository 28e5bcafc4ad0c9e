import type { LinkedBlock } from '../core/columns.js';
import { medianInPlace, SIGMA_PER_MEDIAN } from '../math/median.js';
import { neighbourNoise } from './neighbour-noise.js';
import { sortByPathline } from './pathline-rows.js';

/** Position noise of a run. */
export interface NoiseEstimate {
  /** Standard deviation per axis, length unit; NaN where nothing tells it (and along z in the plane). */
  readonly sigma: readonly [number, number, number];
  /** Differences that the estimate stands on. */
  readonly samples: number;
  readonly method: 'third-differences' | 'neighbours';
}

/** Fewest differences for an estimate: its own relative standard error is then about 1.17 / sqrt(30) = 0.2. */
const FEWEST = 30;

/**
 * Standard deviation of the position noise from third differences along pathlines, where four samples stand in
 * successive frames: sigma = 1.482602 median |d|, d the third difference over sqrt(20) (its variance for white noise
 * is 20 sigma^2). With uneven times d is the third divided difference over the root of its own noise gain, which for
 * even times is the same: motion up to a constant acceleration drops out exactly. The change of acceleration remains
 * in it, so the estimate is an upper bound where the flow is fast for the frame rate; outliers below a few per cent
 * hardly move it.
 *
 * Where no pathline has four samples in a row (image pairs) the scatter of displacements among neighbours is taken,
 * see `neighbourNoise`. Deterministic; memory and cost grow with the blocks, so give it a few thousand detections.
 */
export function estimateNoise(blocks: readonly LinkedBlock[]): NoiseEstimate {
  const sorted = sortByPathline(blocks);
  const { start, frame, time } = sorted;
  const rows = frame.length;
  const inRow = new Uint8Array(rows);
  let count = 0;
  for (let p = 0; p + 1 < start.length; p++) {
    for (let i = start[p]!; i + 3 < start[p + 1]!; i++) {
      if (frame[i + 3]! - frame[i]! !== 3) continue;
      inRow[i] = 1;
      count++;
    }
  }
  if (count < FEWEST) return neighbourNoise(blocks);
  const sizes = new Float64Array(count);
  const along = (values: Float64Array): number => {
    let n = 0;
    for (let i = 0; i < rows; i++) if (inRow[i] === 1) sizes[n++] = Math.abs(thirdDifference(time, values, i));
    return SIGMA_PER_MEDIAN * medianInPlace(sizes, n);
  };
  const z = sorted.z.length > 0 ? along(sorted.z) : Number.NaN;
  return { sigma: [along(sorted.x), along(sorted.y), z], samples: count, method: 'third-differences' };
}

/** Third divided difference of samples i .. i + 3, over the root of its noise gain: for white noise of unit variance it has unit variance. */
function thirdDifference(time: Float64Array, values: Float64Array, i: number): number {
  const t0 = time[i]!;
  // In units of the mean interval, so that the weights are near -1, 3, -3, 1 over 6.
  const unit = (time[i + 3]! - t0) / 3;
  const a = (time[i + 1]! - t0) / unit;
  const b = (time[i + 2]! - t0) / unit;
  const c = 3;
  const w0 = -1 / (a * b * c);
  const w1 = 1 / (a * (a - b) * (a - c));
  const w2 = 1 / (b * (b - a) * (b - c));
  const w3 = 1 / (c * (c - a) * (c - b));
  const x0 = values[i]!;
  const sum = w1 * (values[i + 1]! - x0) + w2 * (values[i + 2]! - x0) + w3 * (values[i + 3]! - x0);
  return sum / Math.sqrt(w0 * w0 + w1 * w1 + w2 * w2 + w3 * w3);
}
