import type { Dims, LinkedBlock } from '../core/columns.js';
import { LastSamples } from './last-samples.js';

/** Rows of a frame and frames of a gap that fit one number of `before` and `after`. */
export const PLACE_BITS = 24;
export const PLACE_MASK = (1 << PLACE_BITS) - 1;
const LONGEST_GAP = 127;

type Column = Float64Array | Float32Array | Int32Array | Uint16Array | Uint8Array;

/** Columns by row of the held frames. */
export interface HeldColumns {
  readonly x: Float64Array;
  readonly y: Float64Array;
  /** Empty in the plane, as are the other columns along z. */
  readonly z: Float64Array;
  readonly detection: Float64Array;
  readonly pathline: Int32Array;
  readonly linkRisk: Float32Array;
  /** Neighbouring samples of the same pathline, as `HeldFrames.before` reads them; -1: none. */
  readonly before: Int32Array;
  readonly after: Int32Array;
  /** Bits of `MARK`. */
  readonly marks: Uint8Array;
  readonly flags: Uint16Array;
  /** Fitted position, velocity, acceleration, roots of their noise gains. */
  readonly px: Float64Array;
  readonly py: Float64Array;
  readonly pz: Float64Array;
  readonly u: Float32Array;
  readonly v: Float32Array;
  readonly w: Float32Array;
  readonly ax: Float32Array;
  readonly ay: Float32Array;
  readonly az: Float32Array;
  readonly positionRoot: Float32Array;
  readonly velocityRoot: Float32Array;
  readonly accelerationRoot: Float32Array;
}

/**
 * The last frames of a stream of linked blocks, with room for what is found out about each of their rows. Rows lie in a
 * ring, each frame in one piece, so that nothing is moved when frames are dropped; frames are named by their place
 * among the held ones, 0 the oldest. Memory: 87 bytes a row (125 in a volume).
 */
export class HeldFrames {
  frames = 0;
  /** By held frame: number, time, segment, first row and number of rows. */
  number = new Int32Array(64);
  time = new Float64Array(64);
  segment = new Int32Array(64);
  start = new Int32Array(64);
  rows = new Int32Array(64);
  columns: HeldColumns;
  readonly dims: Dims;
  private readonly expectedFrames: number;
  private readonly last = new LastSamples();
  private capacity = 0;
  private largest = 0;
  /** Frames dropped so far. */
  private dropped = 0;

  /** `expectedFrames`: frames that will be held at once, so that the ring is made in its final size. */
  constructor(dims: Dims, expectedFrames: number) {
    this.dims = dims;
    this.expectedFrames = expectedFrames;
    this.columns = makeColumns(0, dims);
  }

  /** Takes over frame k of a block, and joins its samples to those before; the block is borrowed. */
  append(block: LinkedBlock, k: number): void {
    const from = block.offsets[k]!;
    const to = block.offsets[k + 1]!;
    const rows = to - from;
    let at = this.placeFor(rows);
    if (at < 0) {
      this.grow(rows);
      at = this.placeFor(rows);
    }
    const f = this.frames++;
    if (f >= this.number.length) this.widenFrames();
    this.number[f] = block.number[k]!;
    this.time[f] = block.time[k]!;
    this.segment[f] = block.segment[k]!;
    this.start[f] = at;
    this.rows[f] = rows;
    const { columns } = this;
    columns.x.set(block.x.subarray(from, to), at);
    columns.y.set(block.y.subarray(from, to), at);
    if (this.dims === 3) columns.z.set(block.z.subarray(from, to), at);
    columns.detection.set(block.row.subarray(from, to), at);
    columns.pathline.set(block.pathline.subarray(from, to), at);
    columns.linkRisk.set(block.linkRisk.subarray(from, to), at);
    columns.marks.fill(0, at, at + rows);
    this.join(f);
  }

  /** Forgets the oldest frames. */
  drop(count: number): void {
    if (count <= 0) return;
    for (const column of [this.number, this.time, this.segment, this.start, this.rows]) {
      column.copyWithin(0, count, this.frames);
    }
    this.frames -= count;
    this.dropped += count;
  }

  /** Held frame of the sample before (or after) a sample of frame `k` with this entry in `before` (`after`); negative when it is no longer held. */
  frameBefore(k: number, entry: number): number {
    return k - (entry >>> PLACE_BITS);
  }

  frameAfter(k: number, entry: number): number {
    return k + (entry >>> PLACE_BITS);
  }

  /** Row of that sample, whose frame is `k`. */
  rowIn(k: number, entry: number): number {
    return this.start[k]! + (entry & PLACE_MASK);
  }

  private join(f: number): void {
    const { columns, last } = this;
    const { pathline, before, after } = columns;
    const start = this.start[f]!;
    const now = this.dropped + f;
    for (let i = 0; i < this.rows[f]!; i++) {
      const row = start + i;
      before[row] = -1;
      after[row] = -1;
      if (pathline[row]! < 0) continue;
      last.move(pathline[row]!, now, i, this.dropped);
      if (last.frame < this.dropped) continue;
      const gap = now - last.frame;
      if (gap === 0 || gap > LONGEST_GAP) continue;
      before[row] = (gap << PLACE_BITS) | last.place;
      after[this.start[last.frame - this.dropped]! + last.place] = (gap << PLACE_BITS) | i;
    }
  }

  /** First row for a frame of so many, -1 where the ring has no such room. */
  private placeFor(rows: number): number {
    const { frames, start } = this;
    if (frames === 0) return rows <= this.capacity ? 0 : -1;
    const oldest = start[0]!;
    const end = start[frames - 1]! + this.rows[frames - 1]!;
    if (start[frames - 1]! < oldest) return end + rows <= oldest ? end : -1;
    if (end + rows <= this.capacity) return end;
    return rows <= oldest ? 0 : -1;
  }

  /** A larger ring, the held frames in order at its beginning. Column after column, so that only one is held twice. */
  private grow(rows: number): void {
    const { start, frames } = this;
    if (rows > PLACE_MASK) throw new RangeError(`frame of ${rows} rows: at most ${PLACE_MASK}`);
    this.largest = Math.max(this.largest, rows);
    let held = rows;
    for (let k = 0; k < frames; k++) held += this.rows[k]!;
    // One more than is held at once: the ring's end may stay unused where the next frame does not fit.
    const usual = Math.ceil((this.expectedFrames + 1) * this.largest * 1.03);
    this.capacity = Math.max(held + this.largest, Math.min(usual, 4 * held));
    const columns = this.columns as unknown as Record<string, Column>;
    const made: Record<string, Column> = {};
    for (const name of Object.keys(columns)) {
      const old = columns[name]!;
      const size = NO_PLANE.has(name) && this.dims === 2 ? 0 : this.capacity;
      const wider = new (old.constructor as new (length: number) => Column)(size);
      let at = 0;
      if (size > 0) {
        for (let k = 0; k < frames; k++) {
          wider.set(old.subarray(start[k]!, start[k]! + this.rows[k]!), at);
          at += this.rows[k]!;
        }
      }
      made[name] = wider;
    }
    this.columns = made as unknown as HeldColumns;
    let at = 0;
    for (let k = 0; k < frames; k++) {
      start[k] = at;
      at += this.rows[k]!;
    }
  }

  private widenFrames(): void {
    const size = 2 * this.number.length;
    this.number = wider(this.number, new Int32Array(size));
    this.time = wider(this.time, new Float64Array(size));
    this.segment = wider(this.segment, new Int32Array(size));
    this.start = wider(this.start, new Int32Array(size));
    this.rows = wider(this.rows, new Int32Array(size));
  }
}

/** Columns that a plane has not. */
const NO_PLANE = new Set(['z', 'pz', 'w', 'az']);

function makeColumns(rows: number, dims: Dims): HeldColumns {
  const deep = dims === 3 ? rows : 0;
  return {
    x: new Float64Array(rows),
    y: new Float64Array(rows),
    z: new Float64Array(deep),
    detection: new Float64Array(rows),
    pathline: new Int32Array(rows),
    linkRisk: new Float32Array(rows),
    before: new Int32Array(rows),
    after: new Int32Array(rows),
    marks: new Uint8Array(rows),
    flags: new Uint16Array(rows),
    px: new Float64Array(rows),
    py: new Float64Array(rows),
    pz: new Float64Array(deep),
    u: new Float32Array(rows),
    v: new Float32Array(rows),
    w: new Float32Array(deep),
    ax: new Float32Array(rows),
    ay: new Float32Array(rows),
    az: new Float32Array(deep),
    positionRoot: new Float32Array(rows),
    velocityRoot: new Float32Array(rows),
    accelerationRoot: new Float32Array(rows),
  };
}

function wider<C extends Column>(old: C, empty: C): C {
  empty.set(old);
  return empty;
}
