import type { LinkedBlock } from '../core/columns.js';

/** What is known of a row of a window while it is fitted; bits. */
export const MARK = {
  offFit: 1,
  offNeighbours: 2,
  hasVelocity: 4,
  /** Its pathline also has a sample in the next frame. */
  inNextFrame: 8,
  /** Its pathline also has a sample in one of the two frames before. */
  inTwoFramesBefore: 16,
  /** Its fit could not be freed from samples that are off their fit. */
  restsOnOff: 32,
} as const;

/**
 * Samples that frame index `k` is judged among: all of frame f itself (first, `judged` of them), then those of
 * frames f - 1 and f + 1 whose pathline has none nearer in time, so that every pathline speaks once. Only frames of
 * the same segment and only samples with a velocity. Writes rows into `into`, which holds three frames.
 */
export function neighboursOfFrame(
  window: LinkedBlock,
  k: number,
  marks: Uint8Array,
  into: Uint32Array,
): { readonly judged: number; readonly count: number } {
  const { number, segment, offsets } = window;
  let count = 0;
  for (let r = offsets[k]!; r < offsets[k + 1]!; r++) if ((marks[r]! & MARK.hasVelocity) !== 0) into[count++] = r;
  const judged = count;
  if (k > 0 && number[k - 1] === number[k]! - 1 && segment[k - 1] === segment[k]) {
    for (let r = offsets[k - 1]!; r < offsets[k]!; r++) {
      if ((marks[r]! & (MARK.hasVelocity | MARK.inNextFrame)) === MARK.hasVelocity) into[count++] = r;
    }
  }
  if (k + 1 < number.length && number[k + 1] === number[k]! + 1 && segment[k + 1] === segment[k]) {
    for (let r = offsets[k + 1]!; r < offsets[k + 2]!; r++) {
      if ((marks[r]! & (MARK.hasVelocity | MARK.inTwoFramesBefore)) === MARK.hasVelocity) into[count++] = r;
    }
  }
  return { judged, count };
}
