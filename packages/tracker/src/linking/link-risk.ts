import type { Candidates } from './candidates.js';

/**
 * Fall of a surprise's density with q, its square over the expected one: (1 + q / 4)^-4. Heavier than Gauss's exp(-q),
 * because the expected squares are estimates themselves (Student's law); only * and /, the same bits in every engine. Not
 * normalised (its integral over the plane is 4/3 of the peak's area): the measured calibration below takes that in.
 */
export function decay(q: number): number {
  const base = 1 + q * (1 / 4);
  const p2 = base * base;
  return 1 / (p2 * p2);
}

/** Observed over reckoned: of large risks, what small ones have more, and where the change is. Measured. */
const LARGE_RISK_FACTOR = 0.6;
const SMALL_RISK_FACTOR = 1.7;
const SMALL_RISK = 8e-4;

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
  return calibrated(against / (density[chosen] + against));
}

/**
 * What is left out of the sum above (surprises larger than their law, exchanges of three) makes small risks larger;
 * that expected squares lean to the safe side makes large ones smaller. The factors were set on the flows
 * of bench/linking, whose record shows how well stated risks hold (bench/results/linking.md).
 */
function calibrated(risk: number): number {
  return risk * (LARGE_RISK_FACTOR + SMALL_RISK_FACTOR / (1 + risk * (1 / SMALL_RISK)));
}
