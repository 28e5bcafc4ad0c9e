import { FLAG } from '../core/columns.js';

/**
 * Flags that follow from how the fit of a sample came about. `first`, `last`: frame numbers of the first and last
 * sample of its pathline in reach; `frame`: its own; `half`: half the span; `from`, `to`, `count`: first and last
 * frame number in its window and samples there.
 */
export function fitFlags(
  first: number,
  last: number,
  frame: number,
  half: number,
  from: number,
  to: number,
  count: number,
): number {
  const nearEnd = frame - first < half || last - frame < half ? FLAG['near-end'] : 0;
  const bridged = to - from + 1 > count ? FLAG.bridged : 0;
  return nearEnd | bridged;
}

/** `doubtful-link` where the risk of the link into this sample or of the one to the next (0 at the last) is above the limit. */
export function linkFlag(risk: number, nextRisk: number, limit: number): number {
  return risk > limit || nextRisk > limit ? FLAG['doubtful-link'] : 0;
}
