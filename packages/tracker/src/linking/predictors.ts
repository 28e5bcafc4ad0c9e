import type { ActivePathlines } from './active-pathlines.js';
import type { FlowGrid } from './flow-grid.js';
import type { NeighbourFlow } from './neighbour-flow.js';
import { SurpriseRecord } from './surprise-record.js';
import { SurpriseScale } from './surprise-scale.js';

/**
 * Ways to guess where a pathline goes: the long picture of the flow; constant velocity; the flow of the interval
 * before, alone or with the pathline's own deviation from the flow about it; the same with the flow of this interval.
 */
const PICTURE = 0;
const VELOCITY = 1;
const BEFORE = 2;
const NOW = 4;
/** Added to BEFORE or NOW: with the pathline's own deviation. */
const OWN = 1;
const GUESSES = 6;
/** Guesses that do not come from the flow about the pathline, as bits. */
const NOT_FLOW = (1 << PICTURE) | (1 << VELOCITY);

/** Weight of neighbours (of about 12 in the midst of a field) below which their fit is no guess. */
export const LEAST_WEIGHT = 1.2;
/** Weight of the record against the scatter of the neighbours about their fit, in neighbours. */
const RECORD_WEIGHT = 6;
/** Share of the weights that is left for the scatter after a quadratic is fitted (36 neighbours, 6 terms). */
const SCATTER_SHARE = 0.75;
/** Leverage that a fit in the midst of neighbours has. */
const TYPICAL_LEVERAGE = 0.2;
/** Share of a pathline's own squared deviation that is held against the flow alone. */
const DEVIATION_BLAME = 0.3;
/** Constant velocity is good enough for the first round where its mean squared surprise is at most this, squared spacings. */
const EASY = 0.004;
/** The fit for a single detection is made anew if the middle of the step moved by more than this, spacings. */
const FAR = 0.2;

/** Where a pathline is expected. */
export interface Prediction {
  x: number;
  y: number;
  z: number;
  /** Expected squared distance of a true detection from it, link space. */
  expected: number;
  /** Expected square that the gate goes by: at least `expected`. */
  widest: number;
}

/**
 * Predicts where pathlines go. In the first round of a frame those that can be told at little cost: by constant velocity
 * where that has served of late, else by the flow of the interval before. In later rounds the rest, by the flow of this
 * interval as the links made so far show it. Guesses are weighted by the inverse fourth power of their mean squared
 * surprise: the best ones decide and average their errors; which ones is measured, not set.
 *
 * The expected square of a prediction is that of its best guess, from the record of the cell, the scatter of the
 * neighbours about their fit and how far the fit reaches (its leverage), scaled so that it is right on the whole.
 */
export class Predictors {
  /** Flow of this interval from the links made so far; null in the first round. */
  now: NeighbourFlow | null = null;
  /** Flow of the interval before. */
  before: NeighbourFlow;
  /** Predictions since it was last set to 0 that had no neighbours to go by. */
  unsupported = 0;
  private readonly record: SurpriseRecord;
  private readonly scale = new SurpriseScale();
  private readonly picture: FlowGrid;
  private readonly floor: number;
  private readonly start: number;
  private readonly easy: number;
  private readonly far: number;
  private readonly thorough: boolean;
  private readonly flow = new Float64Array(3);
  private readonly extra = new Float64Array(GUESSES);
  private readonly chosen = new Int32Array(GUESSES);
  /** Of every active pathline in this frame: guesses (x y z each), which were made (bits), cell, kind, square before scaling. */
  private guessOf = new Float64Array(0);
  private madeOf = new Uint8Array(0);
  private cellOf = new Int32Array(0);
  private kindOf = new Uint8Array(0);
  private plainOf = new Float64Array(0);

  /**
   * `floor`: least expected square (position noise), `start`: expected square before anything is known, `spacing`: mean
   * spacing of a frame. Without `thorough` only constant velocity and, for single detections, the picture.
   */
  constructor(
    picture: FlowGrid,
    before: NeighbourFlow,
    floor: number,
    start: number,
    spacing: number,
    thorough: boolean,
  ) {
    this.picture = picture;
    this.before = before;
    this.floor = floor;
    this.start = start;
    this.easy = EASY * spacing * spacing;
    this.far = FAR * FAR * spacing * spacing;
    this.thorough = thorough;
    this.record = new SurpriseRecord(GUESSES, picture.cells, floor, start);
  }

  /** Room for the active pathlines of a frame. */
  begin(rows: number): void {
    if (this.madeOf.length < rows) {
      const size = Math.ceil(rows * 1.3) + 64;
      this.guessOf = new Float64Array(size * 3 * GUESSES);
      this.madeOf = new Uint8Array(size);
      this.cellOf = new Int32Array(size);
      this.kindOf = new Uint8Array(size);
      this.plainOf = new Float64Array(size);
    }
    this.madeOf.fill(0, 0, rows);
  }

  /** Predicts entry `i` at `time`; false: it waits for a later round. */
  predict(active: ActivePathlines, i: number, time: number, to: Prediction): boolean {
    if (!this.guess(active, i, time, to)) return false;
    const missed = active.missed[i];
    // Errors of a way that was only supposed add up from frame to frame.
    const square = to.expected * (1 + missed);
    const kind = kindOf(active.age[i], missed, this.madeOf[i]);
    this.kindOf[i] = kind;
    this.plainOf[i] = square;
    const scaled = Math.max(square * this.scale.of(kind), this.floor);
    to.expected = scaled;
    // The gate is not scaled down: what is not looked at can never tell that it was too narrow.
    to.widest = Math.max(scaled, square);
    return true;
  }

  private guess(active: ActivePathlines, i: number, time: number, to: Prediction): boolean {
    const single = active.age[i] < 2;
    const cell = this.picture.cellAt(active.x[i], active.y[i], active.z[i]);
    this.cellOf[i] = cell;
    if (this.thorough) {
      const first = this.now === null;
      if (first && (single || active.missed[i] > 0)) return false;
      const easy = first && this.record.knows(VELOCITY) && this.record.of(cell, VELOCITY) <= this.easy;
      if (!easy) {
        if (single) this.singleAlongFlow(active, i, time, cell, to);
        else this.alongFlow(active, i, time, cell, to);
        return true;
      }
    } else if (single) {
      this.byPicture(active, i, time, cell, to);
      return true;
    }
    const step = time - active.time[i];
    to.x = active.x[i] + step * active.u[i];
    to.y = active.y[i] + step * active.v[i];
    to.z = active.z[i] + step * active.w[i];
    this.note(i, VELOCITY, to.x, to.y, to.z);
    to.expected = this.record.of(cell, VELOCITY);
    return true;
  }

  /** A single detection goes with the picture, read at the middle of the step. */
  private byPicture(active: ActivePathlines, i: number, time: number, cell: number, to: Prediction): void {
    const { picture, flow } = this;
    const x = active.x[i];
    const y = active.y[i];
    const z = active.z[i];
    const step = time - active.time[i];
    const half = 0.5 * step;
    picture.at(x, y, z, flow);
    const known = picture.at(x + half * flow[0], y + half * flow[1], z + half * flow[2], flow) > 0;
    to.x = x + step * flow[0];
    to.y = y + step * flow[1];
    to.z = z + step * flow[2];
    this.note(i, PICTURE, to.x, to.y, to.z);
    const square = this.record.of(cell, PICTURE);
    to.expected = known ? square : Math.max(square, this.start);
  }

  /** A single detection goes with the flow about it. */
  private singleAlongFlow(active: ActivePathlines, i: number, time: number, cell: number, to: Prediction): void {
    const { flow, now, before, picture } = this;
    const near = now ?? before;
    const x = active.x[i];
    const y = active.y[i];
    const z = active.z[i];
    const step = time - active.time[i];
    const half = 0.5 * step;
    picture.at(x, y, z, flow);
    const mx = x + half * flow[0];
    const my = y + half * flow[1];
    const mz = z + half * flow[2];
    let weight = near.along(x, y, z, step, mx, my, mz, i, flow);
    if (weight > LEAST_WEIGHT) {
      const nx = x + half * flow[0];
      const ny = y + half * flow[1];
      const nz = z + half * flow[2];
      const moved = (nx - mx) * (nx - mx) + (ny - my) * (ny - my) + (nz - mz) * (nz - mz);
      if (moved > this.far) weight = near.along(x, y, z, step, nx, ny, nz, i, flow);
    }
    if (!(weight > LEAST_WEIGHT)) {
      this.unsupported++;
      this.byPicture(active, i, time, cell, to);
      return;
    }
    active.noteFlow(i, flow);
    to.x = x + step * flow[0];
    to.y = y + step * flow[1];
    to.z = z + step * flow[2];
    const g = now === null ? BEFORE : NOW;
    this.note(i, g, to.x, to.y, to.z);
    to.expected = this.squareNear(near, cell, g, step);
  }

  /** Constant velocity and the flow about the pathline, weighted. */
  private alongFlow(active: ActivePathlines, i: number, time: number, cell: number, to: Prediction): void {
    const { flow, extra, chosen, now, before, record, guessOf } = this;
    const near = now ?? before;
    const g = now === null ? BEFORE : NOW;
    const x = active.x[i];
    const y = active.y[i];
    const z = active.z[i];
    const u = active.u[i];
    const v = active.v[i];
    const w = active.w[i];
    const step = time - active.time[i];
    const half = 0.5 * step;
    // Links of the interval before bear the entries' numbers only while no frame was missed.
    const without = now !== null || active.missed[i] === 0 ? i : -1;
    let count = 0;
    this.note(i, VELOCITY, x + step * u, y + step * v, z + step * w);
    extra[VELOCITY] = 0;
    chosen[count++] = VELOCITY;
    const weight = near.along(x, y, z, step, x + half * u, y + half * v, z + half * w, without, flow);
    if (weight > LEAST_WEIGHT) {
      active.noteFlow(i, flow);
      const du = active.du[i];
      const dv = active.dv[i];
      const dw = active.dw[i];
      const px = x + step * flow[0];
      const py = y + step * flow[1];
      const pz = z + step * flow[2];
      this.note(i, g, px, py, pz);
      extra[g] = this.squareNear(near, cell, g, step) - record.of(cell, g);
      chosen[count++] = g;
      let model = g;
      if (!Number.isNaN(du)) {
        extra[g] += DEVIATION_BLAME * step * step * (du * du + dv * dv + dw * dw);
        model = g + OWN;
        this.note(i, model, px + step * du, py + step * dv, pz + step * dw);
        extra[model] = this.squareNear(near, cell, model, step) - record.of(cell, model);
        chosen[count++] = model;
      }
      // Constant velocity is blamed for what it differs by from the flow, beyond what that itself may err.
      const at = 3 * (GUESSES * i + VELOCITY);
      const by = 3 * (GUESSES * i + model);
      const dx = guessOf[at] - guessOf[by];
      const dy = guessOf[at + 1] - guessOf[by + 1];
      const dz = guessOf[at + 2] - guessOf[by + 2];
      const over = dx * dx + dy * dy + dz * dz - record.of(cell, model) - extra[model];
      if (over > 0) extra[VELOCITY] = over;
    } else this.unsupported++;
    this.combine(i, cell, count, to);
  }

  /** Weighted mean of the chosen guesses of entry `i`, and the least of their expected squares. */
  private combine(i: number, cell: number, count: number, to: Prediction): void {
    const { guessOf, chosen, extra, record } = this;
    let sum = 0;
    let px = 0;
    let py = 0;
    let pz = 0;
    let least = Number.POSITIVE_INFINITY;
    for (let c = 0; c < count; c++) {
      const g = chosen[c];
      const square = Math.max(record.of(cell, g) + extra[g], this.floor);
      if (square < least) least = square;
      // In units of the floor, so that the fourth power neither overflows nor vanishes.
      const ratio = this.floor / square;
      const weight = ratio * ratio * ratio * ratio;
      const at = 3 * (GUESSES * i + g);
      sum += weight;
      px += weight * guessOf[at];
      py += weight * guessOf[at + 1];
      pz += weight * guessOf[at + 2];
    }
    to.x = px / sum;
    to.y = py / sum;
    to.z = pz / sum;
    to.expected = least;
  }

  /** Expected square of a guess from the fit just made: scatter about it, leaning on the record, times its reach. */
  private squareNear(near: NeighbourFlow, cell: number, guess: number, step: number): number {
    const typical = this.record.of(cell, guess) / (1 + TYPICAL_LEVERAGE);
    const seen = step * step * near.residual;
    const scatter = (RECORD_WEIGHT * typical + seen) / (RECORD_WEIGHT + SCATTER_SHARE * near.weight);
    return Math.max(scatter * (1 + near.leverage), this.floor);
  }

  private note(i: number, guess: number, x: number, y: number, z: number): void {
    const at = 3 * (GUESSES * i + guess);
    this.guessOf[at] = x;
    this.guessOf[at + 1] = y;
    this.guessOf[at + 2] = z;
    this.madeOf[i] |= 1 << guess;
  }

  /** Counts by how much the detection of entry `i` was off the prediction (z over depth noise). */
  countSurprise(i: number, dx: number, dy: number, dz: number): void {
    this.scale.count(this.kindOf[i], (dx * dx + dy * dy + dz * dz) / this.plainOf[i]);
  }

  /** Records how far each of the guesses made for entry `i` was from its detection; `depth`: 1 / depth noise. */
  learn(i: number, x: number, y: number, z: number, depth: number): void {
    const { guessOf, record } = this;
    const cell = this.cellOf[i];
    for (let made = this.madeOf[i]; made !== 0; made &= made - 1) {
      const g = 31 - Math.clz32(made & -made);
      const at = 3 * (GUESSES * i + g);
      const dx = guessOf[at] - x;
      const dy = guessOf[at + 1] - y;
      const dz = (guessOf[at + 2] - z) * depth;
      record.learn(cell, g, dx * dx + dy * dy + dz * dz);
    }
  }

  /** Closes a frame. */
  fade(): void {
    this.record.fade();
    this.scale.fade();
  }

  /** What was learnt, as copies in plain form. */
  toData(): Float64Array[] {
    return [this.scale.toData(), ...this.record.toData()];
  }

  /** Takes what predictors on the same cells have learnt. */
  restore([scale, ...record]: readonly Float64Array[]): void {
    this.scale.restore(scale);
    this.record.restore(record);
  }
}

/** Kind of a prediction for `SurpriseScale`: by the flow about it or not, single detection or not, missed frames or not. */
function kindOf(age: number, missed: number, made: number): number {
  return ((made & ~NOT_FLOW) !== 0 ? 1 : 0) + (age < 2 ? 2 : 0) + (missed > 0 ? 4 : 0);
}
