import type { ActivePathlines } from './active-pathlines.js';
import type { FlowGrid } from './flow-grid.js';

/** Ways to predict, each with its own record of surprises; see `Predictors.predict`. */
export const PREDICTOR_COUNT = 4;

/** Links from which records are kept: enough to compare, few enough to follow a changing flow. */
const RECORD_PRIOR = 6;

/**
 * Predicts where a pathline goes, from four simple guesses weighted by how well each has done lately at this
 * place: (0) the flow picture alone; (1) the flow picture plus the pathline's own averaged deviation from it;
 * (2) the same with the deviation of the last link alone, which in a uniform picture is constant velocity;
 * (3) constant change of velocity. The flow picture is read at the middle of the coming step, so its gradient
 * along the path stands for the acceleration without amplifying position noise. Weights go as the inverse
 * square of each guess's mean squared surprise in the flow cell: a guess twice as far off counts a quarter.
 */
export class Predictors {
  readonly record: Float64Array[];
  readonly recordWeight: Float64Array;
  private readonly global = new Float64Array(PREDICTOR_COUNT);
  private globalWeight = 0;
  private readonly flow = new Float64Array(3);
  /** Guesses of the last call, x y z each, for the record. */
  readonly guess = new Float64Array(PREDICTOR_COUNT * 3);
  /** Prediction of the last call. */
  x = 0;
  y = 0;
  z = 0;
  /** Expected squared distance of a true detection from the prediction, link space. */
  expected = 0;
  /** Cell the prediction was made in. */
  cell = 0;
  private readonly grid: FlowGrid;
  private readonly floor: number;
  private readonly start: number;

  /** `floor`: least expected square (position noise), `start`: expected square before anything is known. */
  constructor(grid: FlowGrid, floor: number, start: number) {
    this.grid = grid;
    this.floor = floor;
    this.start = start;
    const { cells } = grid;
    this.record = Array.from({ length: PREDICTOR_COUNT }, () => new Float64Array(cells));
    this.recordWeight = new Float64Array(cells);
  }

  /** Predicts entry `i` at `time`; results stand in the fields of this object. */
  predict(active: ActivePathlines, i: number, time: number): void {
    const { grid, flow, guess } = this;
    const step = time - active.time[i];
    const x = active.x[i];
    const y = active.y[i];
    const z = active.z[i];
    const age = active.age[i];
    // Two looks at the flow picture: where the particle is, then at the middle of the step it would take.
    grid.at(x, y, z, flow);
    let fu = flow[0];
    let fv = flow[1];
    let fw = flow[2];
    const half = 0.5 * step;
    const known = grid.at(
      x + half * (fu + active.du[i]),
      y + half * (fv + active.dv[i]),
      z + half * (fw + active.dw[i]),
      flow,
    );
    fu = flow[0];
    fv = flow[1];
    fw = flow[2];
    const cell = grid.cellAt(x, y, z);
    this.cell = cell;
    guess[0] = x + step * fu;
    guess[1] = y + step * fv;
    guess[2] = z + step * fw;
    const surprise = this.surpriseOf(cell, 0);
    if (age < 2) {
      this.x = guess[0];
      this.y = guess[1];
      this.z = guess[2];
      this.expected = known > 0 ? grown(surprise, active.missed[i]) : this.start;
      return;
    }
    guess[3] = x + step * (fu + active.du[i]);
    guess[4] = y + step * (fv + active.dv[i]);
    guess[5] = z + step * (fw + active.dw[i]);
    guess[6] = x + step * active.u[i];
    guess[7] = y + step * active.v[i];
    guess[8] = z + step * active.w[i];
    const guesses = age < 3 ? 3 : 4;
    if (age >= 3) {
      guess[9] = guess[6] + step * (active.u[i] - active.u0[i]);
      guess[10] = guess[7] + step * (active.v[i] - active.v0[i]);
      guess[11] = guess[8] + step * (active.w[i] - active.w0[i]);
    }
    let sum = 0;
    let px = 0;
    let py = 0;
    let pz = 0;
    let least = Number.POSITIVE_INFINITY;
    for (let g = 0; g < guesses; g++) {
      const square = g === 0 ? surprise : this.surpriseOf(cell, g);
      if (square < least) least = square;
      const weight = 1 / (square * square);
      sum += weight;
      px += weight * guess[3 * g];
      py += weight * guess[3 * g + 1];
      pz += weight * guess[3 * g + 2];
    }
    this.x = px / sum;
    this.y = py / sum;
    this.z = pz / sum;
    // A second detection only: its own deviation is no better than two noisy positions.
    this.expected = grown(least, active.missed[i]) * (age < 3 ? 2 : 1);
  }

  /** Records how far each guess of the last `predict` call was from the detection that was linked. */
  learn(x: number, y: number, z: number, depth: number, age: number, cell: number, guess: Float64Array): void {
    const { record, recordWeight, global } = this;
    if (age < 3) return;
    recordWeight[cell] += 1;
    this.globalWeight += 1;
    for (let g = 0; g < PREDICTOR_COUNT; g++) {
      const dx = guess[3 * g] - x;
      const dy = guess[3 * g + 1] - y;
      const dz = (guess[3 * g + 2] - z) * depth;
      const square = dx * dx + dy * dy + dz * dz;
      record[g][cell] += square;
      global[g] += square;
    }
  }

  /** Forgets a share of the records. */
  fade(keep: number): void {
    for (let cell = 0; cell < this.recordWeight.length; cell++) this.recordWeight[cell] *= keep;
    for (const squares of this.record) {
      for (let cell = 0; cell < squares.length; cell++) squares[cell] *= keep;
    }
    this.globalWeight *= keep;
    for (let g = 0; g < PREDICTOR_COUNT; g++) this.global[g] *= keep;
  }

  /** Mean squared surprise of one guess in a cell, leaning on the whole field where the cell has seen little. */
  private surpriseOf(cell: number, g: number): number {
    const everywhere = this.globalWeight > 0 ? this.global[g] / this.globalWeight : this.start;
    const square = (this.record[g][cell] + RECORD_PRIOR * everywhere) / (this.recordWeight[cell] + RECORD_PRIOR);
    return Math.max(square, this.floor);
  }
}

/** Expected squares grow with the square of the step: a velocity error acts over its whole length. */
function grown(square: number, missed: number): number {
  const steps = 1 + missed;
  return square * steps * steps;
}
