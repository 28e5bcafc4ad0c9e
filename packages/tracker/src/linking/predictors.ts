import type { ActivePathlines } from './active-pathlines.js';
import type { FlowGrid } from './flow-grid.js';

/** Pictures of the flow that are kept: see `pictures.ts`. */
export const PICTURES = 3;
/** Guesses: flow alone and flow plus own deviation for each picture, constant velocity, constant change of velocity. */
const GUESSES = 2 * PICTURES + 2;
/** Numbers of a pathline's guesses, x y z each. */
export const GUESS_SIZE = 3 * GUESSES;
const CONSTANT_VELOCITY = 2 * PICTURES;
const CONSTANT_CHANGE = CONSTANT_VELOCITY + 1;

/** Guesses that a pathline can make with one detection, with two, and with more. */
const WITH_ONE = Array.from({ length: PICTURES }, (_, p) => 2 * p);
const WITH_MORE = Array.from({ length: GUESSES }, (_, g) => g);
const WITH_TWO = WITH_MORE.filter((g) => g !== CONSTANT_CHANGE);

/** Links from which records are kept: enough to compare, few enough to follow a changing flow. */
const RECORD_PRIOR = 12;

/**
 * Predicts where a pathline goes, from simple guesses weighted by how well each has done lately at this place. For
 * each picture of the flow: the picture alone, and the picture plus the pathline's own deviation from it (averaged
 * over its links for the first picture, of the last link for the others). Besides: constant velocity, and constant
 * change of velocity. Pictures are read at the middle of the coming step, so that their gradient along the path
 * stands for the acceleration without amplifying position noise.
 *
 * Weights go as the inverse fourth power of each guess's mean squared surprise in the flow cell: the best two or
 * three decide, and average their errors; which ones differs from place to place and is measured, not set.
 */
export class Predictors {
  private readonly record: Float64Array[];
  private readonly recordWeight: Float64Array;
  private readonly global = new Float64Array(GUESSES);
  private globalWeight = 0;
  private readonly flow = new Float64Array(3);
  /** Guesses of the last call, x y z each, for the record. */
  readonly guess = new Float64Array(GUESS_SIZE);
  /** Prediction of the last call. */
  x = 0;
  y = 0;
  z = 0;
  /** Expected squared distance of a true detection from the prediction, link space. */
  expected = 0;
  /** Cell of the first picture that the prediction was made in. */
  cell = 0;
  private readonly pictures: readonly FlowGrid[];
  private readonly floor: number;
  private readonly start: number;

  /** `floor`: least expected square (position noise), `start`: expected square before anything is known. */
  constructor(pictures: readonly FlowGrid[], floor: number, start: number) {
    this.pictures = pictures;
    this.floor = floor;
    this.start = start;
    const { cells } = pictures[0];
    this.record = Array.from({ length: GUESSES }, () => new Float64Array(cells));
    this.recordWeight = new Float64Array(cells);
  }

  /** Predicts entry `i` at `time`; results stand in the fields of this object. */
  predict(active: ActivePathlines, i: number, time: number): void {
    const { pictures, flow, guess } = this;
    const step = time - active.time[i];
    const x = active.x[i];
    const y = active.y[i];
    const z = active.z[i];
    const age = active.age[i];
    this.cell = pictures[0].cellAt(x, y, z);
    // Velocity towards the middle of the coming step: the pathline's own, or the picture's for one that has none.
    let u = active.u[i];
    let v = active.v[i];
    let w = active.w[i];
    if (age < 2) {
      pictures[0].at(x, y, z, flow);
      [u, v, w] = flow;
    }
    const half = 0.5 * step;
    const mx = x + half * u;
    const my = y + half * v;
    const mz = z + half * w;
    let known = 0;
    for (let p = 0; p < PICTURES; p++) {
      const picture = pictures[p];
      const weight = picture.at(mx, my, mz, flow);
      if (p === 0) known = weight;
      const at = 6 * p;
      guess[at] = x + step * flow[0];
      guess[at + 1] = y + step * flow[1];
      guess[at + 2] = z + step * flow[2];
      if (age < 2) continue;
      let du = active.du[i];
      let dv = active.dv[i];
      let dw = active.dw[i];
      if (p > 0) {
        picture.at(active.mx[i], active.my[i], active.mz[i], flow);
        du = u - flow[0];
        dv = v - flow[1];
        dw = w - flow[2];
      }
      guess[at + 3] = guess[at] + step * du;
      guess[at + 4] = guess[at + 1] + step * dv;
      guess[at + 5] = guess[at + 2] + step * dw;
    }
    if (age < 2) {
      this.combine(WITH_ONE);
      this.expected = known > 0 ? grown(this.expected, active.missed[i]) : this.start;
      return;
    }
    const at = 3 * CONSTANT_VELOCITY;
    guess[at] = x + step * u;
    guess[at + 1] = y + step * v;
    guess[at + 2] = z + step * w;
    if (age >= 3) {
      guess[at + 3] = guess[at] + step * (u - active.u0[i]);
      guess[at + 4] = guess[at + 1] + step * (v - active.v0[i]);
      guess[at + 5] = guess[at + 2] + step * (w - active.w0[i]);
    }
    this.combine(age < 3 ? WITH_TWO : WITH_MORE);
    // A second detection only: its own deviation is no better than two noisy positions.
    this.expected = grown(this.expected, active.missed[i]) * (age < 3 ? 2 : 1);
  }

  /** Records how far each of the guesses made in `cell` was from the detection that was linked. */
  learn(x: number, y: number, z: number, depth: number, cell: number, guess: Float64Array): void {
    const { record, recordWeight, global } = this;
    recordWeight[cell] += 1;
    this.globalWeight += 1;
    for (let g = 0; g < GUESSES; g++) {
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
    for (let g = 0; g < GUESSES; g++) this.global[g] *= keep;
  }

  /** Mean squared surprise of constant velocity in a cell: what two links of unknown pathlines may differ by. */
  bendIn(cell: number): number {
    return this.surpriseOf(cell, CONSTANT_VELOCITY);
  }

  /** Weighted mean of the chosen guesses, and the least of their expected squares. */
  private combine(chosen: readonly number[]): void {
    const { guess, cell } = this;
    let sum = 0;
    let px = 0;
    let py = 0;
    let pz = 0;
    let least = Number.POSITIVE_INFINITY;
    for (const g of chosen) {
      const square = this.surpriseOf(cell, g);
      if (square < least) least = square;
      // In units of the floor, so that the fourth power neither overflows nor vanishes.
      const ratio = this.floor / square;
      const weight = ratio * ratio * ratio * ratio;
      sum += weight;
      px += weight * guess[3 * g];
      py += weight * guess[3 * g + 1];
      pz += weight * guess[3 * g + 2];
    }
    this.x = px / sum;
    this.y = py / sum;
    this.z = pz / sum;
    this.expected = least;
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
