import type { FrameSeen } from './frame-gatherer.js';

/**
 * A step of the frame number that is taken for a jump rather than for missing frames: no recording loses that many
 * frames in a row and goes on (common practice, no source).
 */
export const JUMP = 10_000;

/** A place in the dump by data row and line. */
export interface FramePlace {
  readonly frame: number;
  readonly after: number;
  readonly row: number;
  readonly line: number;
}

/** What the first reading learns frame by frame. Memory: 8 to 32 bytes a frame. */
export class FrameNotes {
  /** Extremes of the coordinates x, y, z; NaN while there are none. */
  readonly min: [number, number, number] = [Number.NaN, Number.NaN, Number.NaN];
  readonly max: [number, number, number] = [Number.NaN, Number.NaN, Number.NaN];
  rows = 0;
  /** Frame numbers left out between present ones, jumps not counted. */
  missing = 0;
  firstMissing: number | null = null;
  jumps = 0;
  firstJump: FramePlace | null = null;
  #frames = 0;
  #numbers = new Int32Array(256);
  #counts = new Uint32Array(256);
  #times = new Float64Array(0);

  get numbers(): Int32Array {
    return this.#numbers.slice(0, this.#frames);
  }

  get counts(): Uint32Array {
    return this.#counts.slice(0, this.#frames);
  }

  /** Time of each frame as its finisher settled it; empty without a time column. */
  get times(): Float64Array {
    return this.#times.slice(0, Math.min(this.#frames, this.#times.length));
  }

  /** A whole frame, to be told in ascending order (see FrameSeen). */
  readonly seen: FrameSeen = (store, frame, from, to, previous, time) => {
    if (this.#frames === this.#numbers.length) {
      const numbers = new Int32Array(2 * this.#frames);
      numbers.set(this.#numbers);
      this.#numbers = numbers;
      const counts = new Uint32Array(2 * this.#frames);
      counts.set(this.#counts);
      this.#counts = counts;
    }
    if (store.shape.time) {
      if (this.#times.length < this.#numbers.length) {
        const times = new Float64Array(this.#numbers.length);
        times.set(this.#times);
        this.#times = times;
      }
      this.#times[this.#frames] = time;
    }
    this.#numbers[this.#frames] = frame;
    this.#counts[this.#frames] = to - from;
    this.#frames++;
    this.rows += to - from;
    this.#widen(0, store.x, from, to);
    this.#widen(1, store.y, from, to);
    if (store.shape.z) this.#widen(2, store.z, from, to);
    if (previous === null || frame === previous + 1) return;
    if (frame - previous > JUMP) {
      this.jumps++;
      this.firstJump ??= { frame, after: previous, row: store.row[from], line: store.line[from] };
    } else {
      this.missing += frame - previous - 1;
      this.firstMissing ??= previous + 1;
    }
  };

  #widen(axis: 0 | 1 | 2, values: Float64Array, from: number, to: number): void {
    // Starting from a value of the column leaves NaN out of every comparison but the first.
    let low = Number.isNaN(this.min[axis]) ? values[from] : this.min[axis];
    let high = Number.isNaN(this.max[axis]) ? values[from] : this.max[axis];
    for (let i = from; i < to; i++) {
      const value = values[i];
      if (value < low) low = value;
      else if (value > high) high = value;
    }
    this.min[axis] = low;
    this.max[axis] = high;
  }
}
