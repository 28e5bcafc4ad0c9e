/**
 * exp(-q) for q >= 0 as (1 + q / 32)^-32: five squarings and a division, so that the bits are the same in every
 * engine. Its tail is heavier than the exponential's (1e-5.6 instead of 1e-6.9 at q = 16), which suits surprises
 * that are not quite Gaussian.
 */
export function decay(q: number): number {
  const base = 1 + q * (1 / 32);
  const p2 = base * base;
  const p4 = p2 * p2;
  const p8 = p4 * p4;
  const p16 = p8 * p8;
  return 1 / (p16 * p16);
}

/**
 * Probability that a link is wrong, from how likely its own detection is against all others that could explain
 * either end: the other candidates of the pathline, the other pathlines that want the detection, and a stray
 * detection at this place.
 *
 * `own`: density of this candidate; `rowSum`, `columnSum`: the same summed over all candidates of the pathline
 * and over all pathlines that have this detection as candidate (own included); `stray`: density of detections
 * that belong to no pathline yet. All per area (volume) of link space.
 */
export function linkRisk(own: number, rowSum: number, columnSum: number, stray: number): number {
  const against = rowSum - own + (columnSum - own) + stray;
  const risk = against / (own + against);
  return risk > 0 ? Math.min(risk, 1) : 0;
}
