import type { HeldFrames } from './held-frames.js';
import { MARK } from './marks.js';

/**
 * Samples that held frame `k` is judged among: all of frame f itself (first, `judged` of them), then those of
 * frames f - 1 and f + 1 whose pathline has none nearer in time, so that every pathline speaks once. Only frames of
 * the same segment and only samples with a velocity. Writes rows into `into`, which holds three frames.
 */
export function neighboursInHeld(
  held: HeldFrames,
  k: number,
  into: Uint32Array,
): { readonly judged: number; readonly count: number } {
  const { number, segment, start, rows } = held;
  const { marks } = held.columns;
  let count = 0;
  const take = (frame: number, mask: number): void => {
    const end = start[frame]! + rows[frame]!;
    for (let row = start[frame]!; row < end; row++) {
      if ((marks[row]! & mask) === MARK.hasVelocity) into[count++] = row;
    }
  };
  take(k, MARK.hasVelocity);
  const judged = count;
  if (k > 0 && number[k - 1] === number[k]! - 1 && segment[k - 1] === segment[k]) {
    take(k - 1, MARK.hasVelocity | MARK.inNextFrame);
  }
  if (k + 1 < held.frames && number[k + 1] === number[k]! + 1 && segment[k + 1] === segment[k]) {
    take(k + 1, MARK.hasVelocity | MARK.inTwoFramesBefore);
  }
  return { judged, count };
}
