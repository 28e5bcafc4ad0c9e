import { medianInPlace } from '../math/median.js';

/**
 * How far an outlier must stand out of the residuals around it: a fit that is too stiff for the motion leaves
 * residuals of like size along the pathline, while a displaced position leaves at most 0.43 of its own residual
 * on its neighbours (quadratic over 7 even samples: 6/21 over 1 - 7/21). Twice their median lies between the two.
 */
const STANDS_OUT = 2;

/**
 * Finds positions off the fit of their own pathline. `residual[i]`: distance from the fit over its expected standard
 * deviation, the largest over the axes, NaN where the fit has no redundancy; `frame`: frame numbers, ascending.
 * Sample i is off when its residual exceeds `limit`, when none within `half` frames has a larger one, and when it
 * is more than twice the median of the others there. So of several bad positions within half a span only the worst
 * is named. Returns how many of `from .. to - 1` it marked in `off`. `scratch`: at least 2 half + 1 long.
 */
export function markOffFit(
  residual: Float64Array,
  frame: Int32Array,
  count: number,
  from: number,
  to: number,
  half: number,
  limit: number,
  off: Uint8Array,
  scratch: Float64Array,
): number {
  let marked = 0;
  for (let i = from; i < to; i++) {
    const own = residual[i]!;
    if (!(own > limit)) continue;
    let others = 0;
    let largest = true;
    for (let j = i - 1; j >= 0 && frame[i]! - frame[j]! <= half; j--) {
      if (residual[j]! > own) largest = false;
      if (residual[j]! >= 0) scratch[others++] = residual[j]!;
    }
    for (let j = i + 1; j < count && frame[j]! - frame[i]! <= half; j++) {
      if (residual[j]! > own) largest = false;
      if (residual[j]! >= 0) scratch[others++] = residual[j]!;
    }
    if (!largest || others < 2) continue;
    if (own > STANDS_OUT * medianInPlace(scratch, others)) {
      off[i] = 1;
      marked++;
    }
  }
  return marked;
}
