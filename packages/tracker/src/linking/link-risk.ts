import type { Candidates } from './candidates.js';

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

/** Assignment of one frame: entry of each pathline (negative: none) and pathline of each detection (-1: free). Borrowed. */
export interface Assignment {
  readonly edgeOfRow: Int32Array;
  readonly rowOfColumn: Int32Array;
}

/**
 * Density with which pathlines that got no detection want each of the columns: they are rivals that lost.
 * Written to `into` (cleared for the frame's columns first).
 */
export function loneRivals(candidates: Candidates, { edgeOfRow }: Assignment, into: Float64Array): void {
  const { rows, columns, start, column, density } = candidates;
  into.fill(0, 0, columns);
  for (let row = 0; row < rows; row++) {
    if (edgeOfRow[row] !== -1) continue;
    for (let e = start[row]; e < start[row + 1]; e++) into[column[e]] += density[e];
  }
}

/**
 * Probability that the chosen link of pathline `row` is wrong, from all that could stand in its place, each with its
 * density: a stray detection at this place; a pathline without a detection that wants this one; a free detection that
 * this pathline could have; and, for a detection that another pathline has, the exchange of the two, which costs the
 * other its own (density of both crosswise over density of the other's link). Two particles close together are only
 * confused by an exchange, so that is what counts, not each one's separate doubt. Exchanges of three are left out.
 *
 * `stray`: density of detections that belong to no pathline yet. All densities per area (volume) of link space.
 */
export function linkRisk(
  candidates: Candidates,
  { edgeOfRow, rowOfColumn }: Assignment,
  row: number,
  stray: number,
  loneDensity: Float64Array,
): number {
  const { start, column, density } = candidates;
  const chosen = edgeOfRow[row];
  const wanted = column[chosen];
  let against = stray + loneDensity[wanted];
  for (let e = start[row]; e < start[row + 1]; e++) {
    if (e === chosen) continue;
    const owner = rowOfColumn[column[e]];
    if (owner === -1) {
      against += density[e];
      continue;
    }
    for (let other = start[owner]; other < start[owner + 1]; other++) {
      if (column[other] === wanted) against += (density[e] * density[other]) / density[edgeOfRow[owner]];
    }
  }
  return against / (density[chosen] + against);
}
