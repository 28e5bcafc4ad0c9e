import { FLAG } from '../core/columns.js';

/**
 * Flags that follow from how the fit of a sample came about. `first`, `last`: frame numbers of the first and last
 * sample of its pathline in reach; `frame`: its own; `half`: half the span; `from`, `to`: first and last frame number
 * in its window; `before`, `behind`: samples there on either side of it.
 *
 * `near-end` where the pathline ends within half a span, or where gaps leave one side with fewer than half the
 * samples it would have: such a fit is one-sided too. So a sample without a velocity always carries it.
 */
export function fitFlags(
  first: number,
  last: number,
  frame: number,
  half: number,
  from: number,
  to: number,
  before: number,
  behind: number,
): number {
  const ends = frame - first < half || last - frame < half;
  const nearEnd = ends || 2 * before < half || 2 * behind < half ? FLAG['near-end'] : 0;
  const bridged = to - from > before + behind ? FLAG.bridged : 0;
  return nearEnd | bridged;
}

/** `doubtful-link` where the risk of the link into this sample or of the one to the next (0 at the last) is above the limit. */
export function linkFlag(risk: number, nextRisk: number, limit: number): number {
  return risk > limit || nextRisk > limit ? FLAG['doubtful-link'] : 0;
}
