import { CellIndex } from '../math/cell-index.js';
import type { FlowGrid } from './flow-grid.js';
import type { FramePair, VoteOptions } from './vote-flow.js';

/** Rings of equal width in which distances to the voted flow are counted. */
const RINGS = 128;
/** Counting stops at this many spacings: beyond it chance candidates outnumber true ones anyway. */
const FARTHEST = 1;
/** Share of the true detections that the counted radius holds: beyond it chance candidates drown them. */
const COUNTED_SHARE = 0.95;
/** Reach over the counted radius: the linker's own prediction may be off for a moment. */
const ALLOWANCE = 2;
/** Bounds of the reach in spacings. */
const LEAST = 0.4;
const MOST = 0.8;

/**
 * Reach from the data: distances between every particle moved with the voted flow and the detections of the
 * next frame are counted in rings; chance candidates fill rings in proportion to their area (volume), which the
 * outer third of the rings measures; what is above is true. The reach is twice the radius that holds 95 % of the
 * true ones, because the linker's own prediction may be off for a moment; gates are narrower than that.
 */
export function chooseReach(pairs: readonly FramePair[], flow: FlowGrid, options: VoteOptions): ReachChoice {
  const { dims, spacing, depthNoise } = options;
  const farthest = FARTHEST * spacing;
  const counts = new Float64Array(RINGS);
  const search = new CellIndex();
  const at = new Float64Array(3);
  const depth = dims === 3 ? 1 / depthNoise : 1;
  for (const { block, first, second } of pairs) {
    const step = block.time[second] - block.time[first];
    const from = block.offsets[second];
    const to = block.offsets[second + 1];
    const near = new Int32Array(to - from);
    search.build(block, from, to, dims, [farthest, farthest, farthest / depth]);
    for (let row = block.offsets[first]; row < block.offsets[first + 1]; row++) {
      const x = block.x[row];
      const y = block.y[row];
      const z = dims === 3 ? block.z[row] : 0;
      flow.at(x, y, z, at);
      flow.at(x + 0.5 * step * at[0], y + 0.5 * step * at[1], z + 0.5 * step * at[2], at);
      const px = x + step * at[0];
      const py = y + step * at[1];
      const pz = z + step * at[2];
      const found = search.near(px, py, pz, near);
      for (let n = 0; n < found; n++) {
        const dx = block.x[near[n]] - px;
        const dy = block.y[near[n]] - py;
        const dz = dims === 3 ? (block.z[near[n]] - pz) * depth : 0;
        const ring = Math.trunc((Math.sqrt(dx * dx + dy * dy + dz * dz) / farthest) * RINGS);
        counts[ring < RINGS ? ring : RINGS - 1]++;
      }
    }
  }
  const choice = reachFromRings(counts, dims);
  return { reach: choice.reach * farthest, expected: choice.expected * farthest * farthest };
}

/** Reach and the mean squared distance of true detections from the voted flow. */
export interface ReachChoice {
  /** Length unit; as a share of the farthest ring's edge out of `reachFromRings`. */
  readonly reach: number;
  /** Length unit squared, from the median distance: (r50 / 0.8326)^2 in the plane, (r50 / 0.8881)^2 in space. */
  readonly expected: number;
}

/** Reach as a share of the farthest ring's edge, from candidates per ring. */
export function reachFromRings(counts: Float64Array, dims: 2 | 3): ReachChoice {
  const rings = counts.length;
  const room = (ring: number) => (dims === 2 ? 2 * ring + 1 : 3 * ring * ring + 3 * ring + 1);
  const outerFrom = Math.trunc((rings * 2) / 3);
  let outer = 0;
  let outerRoom = 0;
  for (let ring = outerFrom; ring < rings; ring++) {
    outer += counts[ring];
    outerRoom += room(ring);
  }
  const chance = outer / outerRoom;
  let total = 0;
  for (let ring = 0; ring < outerFrom; ring++) total += counts[ring] - chance * room(ring);
  const radius = (share: number): number => {
    let inside = 0;
    for (let ring = 0; ring < outerFrom; ring++) {
      const more = counts[ring] - chance * room(ring);
      if (inside + more >= share * total && more > 0) return (ring + (share * total - inside) / more) / rings;
      inside += more;
    }
    return MOST;
  };
  const reach = ALLOWANCE * radius(COUNTED_SHARE);
  // Median of a Rayleigh (Maxwell) distance over its root mean square: sqrt(ln 2) = 0.8326, in space 0.8881.
  const median = radius(0.5) / (dims === 2 ? 0.8326 : 0.8881);
  return { reach: reach < LEAST ? LEAST : Math.min(reach, MOST), expected: median * median };
}
