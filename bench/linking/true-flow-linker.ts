import type { DetectionBlock } from '@wakeloom/tracker';
import { GroupedAssignment } from '@wakeloom/tracker/linking/assign-exact';
import { Candidates } from '@wakeloom/tracker/linking/candidates';
import { CellIndex } from '@wakeloom/tracker/math/cell-index';
import type { Flow } from '@wakeloom/tracker/synthesis/flow';
import { Carrier } from '../../tests/helpers/true-motion';

/** Gate in expected squares: that of the linker. */
const GATE = 25;
/** Handicap of a pathline with a single detection, which may be a false one: that of the linker. */
const NEWBORN_HANDICAP = 3;

/** What the oracle is told. */
export interface OracleOptions {
  readonly flow: Flow;
  /** Standard deviation of the position noise in the plane, length unit. */
  readonly noise: number;
  /** Noise along z over that in the plane. */
  readonly depthNoise: number;
  readonly bridge: number;
  /** Integration steps a frame interval. */
  readonly steps: number;
}

/**
 * The oracle: each pathline's last detection is carried with the true flow over the true time gap, and the exact
 * assignment decides by the distance over the expected square of the noise of both detections alone. The same bridge
 * and gate as the linker, no rejection by risk. Gives the pathline of every row.
 */
export function linkByTrueFlow(block: DetectionBlock, options: OracleOptions): Int32Array {
  const { flow, bridge, depthNoise, steps } = options;
  const { dims, x, y, z } = block;
  const depth = dims === 3 ? 1 / depthNoise : 1;
  const expected = 2 * dims * options.noise * options.noise;
  const reach = Math.sqrt(GATE * expected);
  const carrier = new Carrier(flow);
  const search = new CellIndex();
  const candidates = new Candidates();
  const grouped = new GroupedAssignment();
  const pathline = new Int32Array(x.length);
  let active: Active[] = [];
  let next = 0;
  for (let k = 0; k < block.number.length; k++) {
    if (k > 0 && block.segment[k] !== block.segment[k - 1]) active = [];
    const from = block.offsets[k];
    const to = block.offsets[k + 1];
    const near = new Int32Array(to - from);
    search.build(block, from, to, dims, [reach, reach, reach / depth]);
    candidates.begin(active.length, to - from);
    for (const [i, one] of active.entries()) {
      carrier.move(one.at, block.time[k - 1], block.time[k], steps);
      const found = search.near(one.at[0], one.at[1], one.at[2], near);
      candidates.reserve(found);
      for (let n = 0; n < found; n++) {
        const row = near[n];
        const dx = x[row] - one.at[0];
        const dy = y[row] - one.at[1];
        const dz = dims === 3 ? (z[row] - one.at[2]) * depth : 0;
        const square = (dx * dx + dy * dy + dz * dz) / expected;
        if (square > GATE) continue;
        candidates.column[candidates.edges] = row - from;
        candidates.cost[candidates.edges++] = square + (one.newborn ? NEWBORN_HANDICAP : 0);
      }
      candidates.start[i + 1] = candidates.edges;
    }
    const edgeOfRow = new Int32Array(active.length);
    const rowOfColumn = new Int32Array(to - from).fill(-1);
    grouped.assign(candidates, GATE + NEWBORN_HANDICAP, edgeOfRow, rowOfColumn);
    const kept: Active[] = [];
    for (const [i, one] of active.entries()) if (edgeOfRow[i] < 0 && one.missed++ < bridge) kept.push(one);
    for (let row = from; row < to; row++) {
      const i = rowOfColumn[row - from];
      pathline[row] = i < 0 ? next++ : active[i].id;
      const at = Float64Array.of(x[row], y[row], dims === 3 ? z[row] : 0);
      kept.push({ id: pathline[row], at, missed: 0, newborn: i < 0 });
    }
    active = kept;
  }
  return pathline;
}

interface Active {
  readonly id: number;
  /** Where the true flow has carried the last detection by now. */
  readonly at: Float64Array;
  missed: number;
  readonly newborn: boolean;
}
