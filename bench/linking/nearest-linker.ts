import type { DetectionBlock } from '@wakeloom/tracker';
import { assignQuickly } from '@wakeloom/tracker/linking/assign-quick';
import { Candidates } from '@wakeloom/tracker/linking/candidates';
import { CellIndex } from '@wakeloom/tracker/math/cell-index';

/**
 * Plain nearest neighbour: the detection nearest to a pathline's last one, not farther than `reach`, pairs taken in
 * order of distance, each detection and each pathline once. A pathline waits `bridge` frames for its next detection.
 * Gives the pathline of every row.
 */
export function linkToNearest(block: DetectionBlock, reach: number, bridge: number): Int32Array {
  const { dims, x, y, z } = block;
  const search = new CellIndex();
  const candidates = new Candidates();
  const pathline = new Int32Array(x.length);
  let active: { row: number; missed: number }[] = [];
  let next = 0;
  for (let k = 0; k < block.number.length; k++) {
    if (k > 0 && block.segment[k] !== block.segment[k - 1]) active = [];
    const from = block.offsets[k];
    const to = block.offsets[k + 1];
    const near = new Int32Array(to - from);
    search.build(block, from, to, dims, [reach, reach, reach]);
    candidates.begin(active.length, to - from);
    for (const [i, { row: last }] of active.entries()) {
      const lastZ = dims === 3 ? z[last] : 0;
      const found = search.near(x[last], y[last], lastZ, near);
      candidates.reserve(found);
      for (let n = 0; n < found; n++) {
        const row = near[n];
        const dz = dims === 3 ? z[row] - lastZ : 0;
        candidates.column[candidates.edges] = row - from;
        candidates.cost[candidates.edges++] = (x[row] - x[last]) ** 2 + (y[row] - y[last]) ** 2 + dz * dz;
      }
      candidates.start[i + 1] = candidates.edges;
    }
    const edgeOfRow = new Int32Array(active.length);
    const rowOfColumn = new Int32Array(to - from).fill(-1);
    // Proposals give the matching of a greedy choice over all pairs in order of distance.
    assignQuickly(candidates, edgeOfRow, rowOfColumn, new Int32Array(active.length));
    const kept = active.filter((one, i) => edgeOfRow[i] < 0 && one.missed++ < bridge);
    for (let row = from; row < to; row++) {
      const i = rowOfColumn[row - from];
      pathline[row] = i < 0 ? next++ : pathline[active[i].row];
      kept.push({ row, missed: 0 });
    }
    active = kept;
  }
  return pathline;
}
