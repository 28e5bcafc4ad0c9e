import type { Candidates } from './candidates.js';

/**
 * One-to-one assignment by proposals: each pathline proposes to its cheapest candidate; a detection keeps the
 * cheapest proposer and sends the others on (Gale & Shapley 1962, doi:10.1080/00029890.1962.11989827). With one
 * cost for both sides this is the matching that a greedy choice over all pairs sorted by cost gives, without
 * the sort. Ties: the lower detection, the lower pathline. Cost O(candidates) in practice.
 *
 * `edgeOfRow[i]` becomes the chosen entry or -1; `rowOfColumn` (filled with -1 by the caller) the proposer kept.
 */
export function assignQuickly(
  candidates: Candidates,
  edgeOfRow: Int32Array,
  rowOfColumn: Int32Array,
  queue: Int32Array,
): void {
  const { rows, start, column, cost } = candidates;
  let waiting = 0;
  for (let row = rows - 1; row >= 0; row--) {
    edgeOfRow[row] = -1;
    queue[waiting++] = row;
  }
  while (waiting > 0) {
    const row = queue[--waiting];
    // The next candidate after the refused one in (cost, column) order.
    const refused = edgeOfRow[row];
    let best = -1;
    for (let e = start[row]; e < start[row + 1]; e++) {
      if (refused >= 0 && !after(cost, column, e, refused)) continue;
      if (best === -1 || after(cost, column, best, e)) best = e;
    }
    if (best === -1) {
      edgeOfRow[row] = -1;
      continue;
    }
    edgeOfRow[row] = best;
    const wanted = column[best];
    const rival = rowOfColumn[wanted];
    if (rival === -1) {
      rowOfColumn[wanted] = row;
      continue;
    }
    const rivalCost = cost[edgeOfRow[rival]];
    if (cost[best] < rivalCost || (cost[best] === rivalCost && row < rival)) {
      rowOfColumn[wanted] = row;
      queue[waiting++] = rival;
    } else {
      queue[waiting++] = row;
    }
  }
}

/** True when entry `a` comes after entry `b` in (cost, column) order. */
function after(cost: Float64Array, column: Int32Array, a: number, b: number): boolean {
  return cost[a] > cost[b] || (cost[a] === cost[b] && column[a] > column[b]);
}
