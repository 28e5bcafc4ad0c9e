import type { DetectionBlock, Dims } from '../core/columns.js';
import type { NeighbourSearch } from '../math/neighbour-search.js';
import type { ActivePathlines } from './active-pathlines.js';
import { Candidates } from './candidates.js';
import { decay } from './link-risk.js';
import { GUESS_SIZE, type Predictors } from './predictors.js';

/**
 * Gate: a candidate farther than this many times its expected square is none. Wide (7 standard deviations an axis),
 * because expected squares are averages over a cell and surprises have heavier tails than Gaussian ones; what lies
 * near the gate carries a high risk and is left out by that.
 */
const GATE = 25;
/** Handicap of a pathline with a single detection against one that has proved itself, in units of expected squares. */
const NEWBORN_HANDICAP = 3;
/** Cost above which a pathline had better stay without a detection: no candidate within the gate costs more. */
export const PRICE = GATE + NEWBORN_HANDICAP;
/** A pathline with a single detection may itself be a stray one: its candidates weigh half. */
const NEWBORN_TRUST = 0.5;

/** Finds the candidates of every active pathline in one frame. Buffers are kept; one object a thread. */
export class CandidateSearch {
  readonly candidates = new Candidates();
  /** Guesses behind each pathline's prediction and the cell they were made in, for the record. */
  guessOfRow = new Float64Array(0);
  cellOfRow = new Int32Array(0);
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

  /** Rows `from` .. `to` - 1 of the block are the frame at `time`. */
  collect(
    active: ActivePathlines,
    block: DetectionBlock,
    from: number,
    to: number,
    time: number,
    predictors: Predictors,
  ): void {
    const { candidates, dims, reach, search } = this;
    const depth = dims === 3 ? 1 / this.depthNoise : 1;
    this.reserve(active.count, to - from);
    const { guessOfRow, cellOfRow, near } = this;
    candidates.begin(active.count, to - from);
    search.build(block, from, to, dims, [reach, reach, dims === 3 ? reach * this.depthNoise : reach]);
    const { x, y, z } = block;
    for (let i = 0; i < active.count; i++) {
      predictors.predict(active, i, time);
      guessOfRow.set(predictors.guess, i * GUESS_SIZE);
      cellOfRow[i] = predictors.cell;
      const { expected } = predictors;
      const newborn = active.age[i] < 2;
      const gate = Math.min(GATE * expected, reach * reach);
      const handicap = newborn ? NEWBORN_HANDICAP : 0;
      const scale = 1 / expected;
      const peak = peakDensity(dims, expected) * (newborn ? NEWBORN_TRUST : 1);
      const found = search.near(predictors.x, predictors.y, predictors.z, near);
      candidates.reserve(found);
      for (let n = 0; n < found; n++) {
        const row = near[n];
        const dx = x[row] - predictors.x;
        const dy = y[row] - predictors.y;
        const dz = dims === 3 ? (z[row] - predictors.z) * depth : 0;
        const square = dx * dx + dy * dy + dz * dz;
        if (square > gate) continue;
        const q = square * scale;
        const e = candidates.edges++;
        candidates.column[e] = row - from;
        candidates.cost[e] = q + handicap;
        candidates.density[e] = peak * surpriseDecay(dims, q);
      }
      candidates.start[i + 1] = candidates.edges;
    }
  }

  private reserve(rows: number, columns: number): void {
    if (this.cellOfRow.length < rows) {
      this.cellOfRow = new Int32Array(rows * 2);
      this.guessOfRow = new Float64Array(rows * 2 * GUESS_SIZE);
    }
    if (this.near.length < columns) this.near = new Int32Array(columns * 2);
  }
}

/**
 * Density at the prediction of a surprise with mean square E: 1 / (pi E) in the plane (Gaussian with E = 2 s^2),
 * (3 / (2 pi E))^(3/2) in space (E = 3 s^2; (3 / 2 pi)^(3/2) = 0.329843).
 */
export function peakDensity(dims: Dims, expected: number): number {
  return dims === 2 ? 1 / (Math.PI * expected) : 0.329843 / (expected * Math.sqrt(expected));
}

/** How the density falls off with the squared distance in units of E: exp(-q) in the plane, exp(-3/2 q) in space. */
export function surpriseDecay(dims: Dims, q: number): number {
  return decay(dims === 2 ? q : 1.5 * q);
}
