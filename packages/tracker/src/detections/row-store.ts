import type { DetectionBlock } from '../core/columns.js';
import { ROLE, type RowBatch } from './row-batch.js';

/** Which optional columns a dump carries. */
export interface RowShape {
  readonly z: boolean;
  readonly brightness: boolean;
  readonly pathline: boolean;
  readonly time: boolean;
}

export function shapeOf(used: Uint8Array): RowShape {
  return {
    z: used[ROLE.z] === 1,
    brightness: used[ROLE.brightness] === 1,
    pathline: used[ROLE.pathline] === 1,
    time: used[ROLE.time] === 1,
  };
}

/** Bytes that one row takes in a RowStore. */
export function bytesARow(shape: RowShape): number {
  // x, y, row as Float64 and the line as Uint32, then what the dump carries besides.
  return 28 + (shape.z ? 8 : 0) + (shape.brightness ? 4 : 0) + (shape.pathline ? 4 : 0) + (shape.time ? 8 : 0);
}

/** Rows of a dump as columns, without frame numbers: who holds it knows where each frame starts. */
export class RowStore {
  shape: RowShape;
  capacity: number;
  x: Float64Array;
  y: Float64Array;
  z: Float64Array;
  brightness: Float32Array;
  pathline: Int32Array;
  time: Float64Array;
  row: Float64Array;
  line: Uint32Array;

  constructor(shape: RowShape, capacity: number) {
    this.shape = shape;
    this.capacity = capacity;
    this.x = new Float64Array(capacity);
    this.y = new Float64Array(capacity);
    this.z = new Float64Array(shape.z ? capacity : 0);
    this.brightness = new Float32Array(shape.brightness ? capacity : 0);
    this.pathline = new Int32Array(shape.pathline ? capacity : 0);
    this.time = new Float64Array(shape.time ? capacity : 0);
    this.row = new Float64Array(capacity);
    this.line = new Uint32Array(capacity);
  }

  /** Room for at least `rows`, half as much again at a time. */
  reserve(rows: number): void {
    if (rows <= this.capacity) return;
    const larger = new RowStore(this.shape, Math.max(rows, Math.ceil(this.capacity * 1.5)));
    larger.x.set(this.x);
    larger.y.set(this.y);
    larger.z.set(this.z);
    larger.brightness.set(this.brightness);
    larger.pathline.set(this.pathline);
    larger.time.set(this.time);
    larger.row.set(this.row);
    larger.line.set(this.line);
    this.capacity = larger.capacity;
    this.x = larger.x;
    this.y = larger.y;
    this.z = larger.z;
    this.brightness = larger.brightness;
    this.pathline = larger.pathline;
    this.time = larger.time;
    this.row = larger.row;
    this.line = larger.line;
  }

  /** Copies rows `from .. to - 1` of a batch to `at` and on. */
  put(at: number, batch: RowBatch, from: number, to: number): void {
    const columns = batch.columns;
    if (to - from < 24) {
      // Views cost more than they save on a few rows.
      for (let i = from, j = at; i < to; i++, j++) {
        this.x[j] = columns[ROLE.x][i];
        this.y[j] = columns[ROLE.y][i];
        if (this.shape.z) this.z[j] = columns[ROLE.z][i];
        if (this.shape.brightness) this.brightness[j] = columns[ROLE.brightness][i];
        if (this.shape.pathline) this.pathline[j] = columns[ROLE.pathline][i];
        if (this.shape.time) this.time[j] = columns[ROLE.time][i];
        this.row[j] = batch.row[i];
        this.line[j] = batch.line[i];
      }
      return;
    }
    this.x.set(columns[ROLE.x].subarray(from, to), at);
    this.y.set(columns[ROLE.y].subarray(from, to), at);
    if (this.shape.z) this.z.set(columns[ROLE.z].subarray(from, to), at);
    if (this.shape.brightness) this.brightness.set(columns[ROLE.brightness].subarray(from, to), at);
    if (this.shape.pathline) this.pathline.set(columns[ROLE.pathline].subarray(from, to), at);
    if (this.shape.time) this.time.set(columns[ROLE.time].subarray(from, to), at);
    this.row.set(batch.row.subarray(from, to), at);
    this.line.set(batch.line.subarray(from, to), at);
  }

  /** Moves one row within the store. */
  move(from: number, to: number): void {
    this.x[to] = this.x[from];
    this.y[to] = this.y[from];
    if (this.shape.z) this.z[to] = this.z[from];
    if (this.shape.brightness) this.brightness[to] = this.brightness[from];
    if (this.shape.pathline) this.pathline[to] = this.pathline[from];
    if (this.shape.time) this.time[to] = this.time[from];
    this.row[to] = this.row[from];
    this.line[to] = this.line[from];
  }

  /** Forgets z: blocks are in the plane from now on. */
  flatten(): void {
    this.shape = { ...this.shape, z: false };
    this.z = new Float64Array(0);
  }

  /** New block of rows `from .. to - 1`; `number`, `time` and `offsets` (starting at 0) become the block's own. */
  block(from: number, to: number, number: Int32Array, time: Float64Array, offsets: Uint32Array): DetectionBlock {
    return {
      dims: this.shape.z ? 3 : 2,
      number,
      time,
      segment: new Int32Array(number.length),
      offsets,
      x: this.x.slice(from, to),
      y: this.y.slice(from, to),
      z: this.z.slice(from, to),
      brightness: this.brightness.slice(from, to),
      row: this.row.slice(from, to),
      given: this.pathline.slice(from, to),
    };
  }
}
