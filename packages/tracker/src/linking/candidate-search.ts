import type { DetectionBlock, Dims } from '../core/columns.js';
import type { NeighbourSearch } from '../math/neighbour-search.js';
import type { ActivePathlines } from './active-pathlines.js';
import { Candidates } from './candidates.js';
import type { FrameLinks } from './frame-links.js';
import { decay } from './link-risk.js';
import type { Prediction } from './predictors.js';
import type { Presence } from './presence.js';

/**
 * Gate: a candidate farther than this many times its expected square is none. Wide (7 standard deviations an axis),
 * because expected squares are averages and surprises have heavier tails than Gaussian ones; what lies near the gate
 * carries a high risk and is left out by that.
 */
const GATE = 25;
/** Handicap of a pathline with a single detection against one that has proved itself, in units of expected squares. */
const NEWBORN_HANDICAP = 3;
/** Cost above which a pathline had better stay without a detection: no candidate within the gate costs more. */
export const PRICE = GATE + NEWBORN_HANDICAP;

/** What decides where a pathline is looked for. */
export interface Guide {
  /** Predicts entry `i` at `time` into `prediction`; false: this pathline waits for a later round. */
  predict(active: ActivePathlines, i: number, time: number, prediction: Prediction): boolean;
}

/** Finds the candidates of pathlines in one frame. Buffers are kept; one object a thread. */
export class CandidateSearch {
  readonly candidates = new Candidates();
  /** Active pathline of each row of the candidates. */
  rowEntry = new Int32Array(0);
  /** Probability that each row's particle is in this frame at all. */
  trustOfRow = new Float64Array(0);
  /** Area (volume) of all gates of the last call, link space. */
  gates = 0;
  private near = new Int32Array(0);
  private readonly dims: Dims;
  private readonly reach: number;
  private readonly depthNoise: number;
  private readonly search: NeighbourSearch;

  constructor(dims: Dims, reach: number, depthNoise: number, search: NeighbourSearch) {
    this.dims = dims;
    this.reach = reach;
    this.depthNoise = depthNoise;
    this.search = search;
  }

  /** Takes the frame in rows `from` .. `to` - 1 of the block. */
  begin(block: DetectionBlock, from: number, to: number): void {
    const { dims, reach, search } = this;
    if (this.near.length < to - from) this.near = new Int32Array((to - from) * 2);
    search.build(block, from, to, dims, [reach, reach, dims === 3 ? reach * this.depthNoise : reach]);
  }

  /**
   * Candidates of the `count` active pathlines listed in `entries`, among the detections of the frame
   * that are free in the links. Those that the guide lets wait get no row.
   */
  collect(
    active: ActivePathlines,
    entries: Int32Array,
    count: number,
    block: DetectionBlock,
    from: number,
    time: number,
    { columns, takenBy }: FrameLinks,
    guide: Guide,
    prediction: Prediction,
    presence: Presence,
  ): void {
    const { candidates, dims, reach, search, near } = this;
    const depth = dims === 3 ? 1 / this.depthNoise : 1;
    if (this.rowEntry.length < count) {
      this.rowEntry = new Int32Array(count * 2);
      this.trustOfRow = new Float64Array(count * 2);
    }
    const { rowEntry, trustOfRow } = this;
    candidates.begin(count, columns);
    const { x, y, z } = block;
    const reachSquare = reach * reach;
    let rows = 0;
    let room = 0;
    for (let k = 0; k < count; k++) {
      const i = entries[k];
      if (!guide.predict(active, i, time, prediction)) continue;
      rowEntry[rows] = i;
      const { expected } = prediction;
      const px = prediction.x;
      const py = prediction.y;
      const pz = prediction.z;
      active.px[i] = px;
      active.py[i] = py;
      active.pz[i] = pz;
      const newborn = active.age[i] < 2;
      const gate = Math.min(GATE * prediction.widest, reachSquare);
      room += dims === 2 ? Math.PI * gate : (4 / 3) * Math.PI * gate * Math.sqrt(gate);
      const handicap = newborn ? NEWBORN_HANDICAP : 0;
      const scale = 1 / expected;
      const perWidest = 1 / prediction.widest;
      const trust = presence.of(active.age[i], active.missed[i]);
      trustOfRow[rows] = trust;
      const peak = peakDensity(dims, expected) * trust;
      const found = search.near(px, py, pz, near);
      candidates.reserve(found);
      for (let n = 0; n < found; n++) {
        const row = near[n];
        if (takenBy[row - from] !== -1) continue;
        const dx = x[row] - px;
        const dy = y[row] - py;
        const dz = dims === 3 ? (z[row] - pz) * depth : 0;
        const square = dx * dx + dy * dy + dz * dz;
        if (square > gate) continue;
        const q = square * scale;
        // By column, so that sums over candidates do not depend on how neighbours were looked up.
        const e = candidates.insert(rows, row - from);
        candidates.cost[e] = square * perWidest + handicap;
        candidates.density[e] = peak * surpriseDecay(dims, q);
      }
      candidates.start[++rows] = candidates.edges;
    }
    candidates.rows = rows;
    this.gates = room;
  }
}

/**
 * Density at the prediction of a surprise with mean square E: 1 / (pi E) in the plane (Gaussian with E = 2 s^2),
 * (3 / (2 pi E))^(3/2) in space (E = 3 s^2; (3 / 2 pi)^(3/2) = 0.329843).
 */
export function peakDensity(dims: Dims, expected: number): number {
  return dims === 2 ? 1 / (Math.PI * expected) : 0.329843 / (expected * Math.sqrt(expected));
}

/** How the density falls off with the squared distance in units of E: like exp(-q) in the plane, exp(-3/2 q) in space, with a heavier tail. */
export function surpriseDecay(dims: Dims, q: number): number {
  return decay(dims === 2 ? q : 1.5 * q);
}
