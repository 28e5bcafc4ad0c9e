import type { RunContext } from '../core/context.js';
import { BUCKET_PATHLINES } from './bucket-sort.js';
import { scatterValues } from './move-values.js';
import type { Numbering } from './numbering.js';
import type { PathlineRows } from './pathline-rows.js';
import type { SampleColumn } from './sample-columns.js';
import { type Batch, type Column, columnOf, readBatch, rowBytes, type Spilled } from './spill.js';

/** Rows of a group in one pass, by size: 16 MB of columns, unless one pathline alone is longer. */
const GROUP_BYTES = 16 << 20;

/** Columns of absent axes. */
const NONE = { f64: new Float64Array(0), f32: new Float32Array(0) } as const;

/** Provisional pathlines first .. end - 1 whose rows are assembled together. */
interface Group {
  readonly first: number;
  readonly end: number;
  readonly firstRow: number;
  readonly rows: number;
}

/**
 * From batches in frame order to whole pathlines: yields groups of consecutive pathlines, rows of each in frame
 * order. Every batch is read once for each group it touches; with the batches sorted by bucket that is, all in all,
 * a little more than one reading of the spill. Memory: one group and a window of 1 MB. The yielded columns are used
 * again for the next group. Samples of kept pathlines are counted into `keptPerFrame`, by index of the frame.
 */
export async function* transpose(
  spilled: Spilled,
  numbering: Numbering,
  columns: readonly SampleColumn[],
  keptPerFrame: Int32Array,
  context: RunContext,
  groupBytes = GROUP_BYTES,
): AsyncGenerator<PathlineRows> {
  const capacity = Math.max(1, Math.floor(groupBytes / (rowBytes(columns) + 8)));
  let held: Column[] = [];
  let pathline = new Int32Array(0);
  const most = spilled.batches.reduce((rows, batch) => Math.max(rows, batch.rows), 0);
  const windows = { target: new Int32Array(most), bytes: new ArrayBuffer(8 * most) };
  for (const group of groupsOf(spilled, numbering, capacity)) {
    if (pathline.length < group.rows) {
      const size = Math.max(group.rows, Math.min(capacity, numbering.samples));
      held = columns.map((column) => columnOf(column.stored, size));
      pathline = new Int32Array(size);
    }
    const firstBucket = Math.floor(group.first / BUCKET_PATHLINES);
    const lastBucket = Math.floor((group.end - 1) / BUCKET_PATHLINES);
    for (const batch of spilled.batches) {
      if (batch.buckets[0] > lastBucket || lastOf(batch.buckets) < firstBucket) continue;
      gather(spilled, batch, firstBucket, lastBucket, group, numbering, columns, held, windows, keptPerFrame);
      await context.breathe();
    }
    yield rowsOf(group, numbering, spilled, columns, held, pathline);
  }
}

function lastOf(values: Int32Array): number {
  return values[values.length - 1];
}

function* groupsOf(spilled: Spilled, numbering: Numbering, capacity: number): Generator<Group> {
  let first = 0;
  let firstRow = 0;
  let rows = 0;
  const { final } = numbering;
  for (let p = 0; p < final.length; p++) {
    if (final[p] < 0) continue;
    const count = spilled.counts.array[p];
    if (rows > 0 && rows + count > capacity) {
      yield { first, end: p, firstRow, rows };
      firstRow += rows;
      first = p;
      rows = 0;
    }
    rows += count;
  }
  if (rows > 0) yield { first, end: final.length, firstRow, rows };
}

/** Index of the first entry not below `value`. */
function lowerBound(values: Int32Array, value: number): number {
  let low = 0;
  let high = values.length;
  while (low < high) {
    const middle = (low + high) >> 1;
    if (values[middle] < value) low = middle + 1;
    else high = middle;
  }
  return low;
}

/** Working arrays of `gather`, a batch's rows long, used again from call to call. */
interface Windows {
  readonly target: Int32Array;
  readonly bytes: ArrayBuffer;
}

function gather(
  spilled: Spilled,
  batch: Batch,
  firstBucket: number,
  lastBucket: number,
  group: Group,
  numbering: Numbering,
  columns: readonly SampleColumn[],
  held: readonly Column[],
  windows: Windows,
  keptPerFrame: Int32Array,
): void {
  const from = lowerBound(batch.buckets, firstBucket);
  const to = lowerBound(batch.buckets, lastBucket + 1);
  if (from === to) return;
  const start = batch.firstRows[from];
  const rows = (to < batch.firstRows.length ? batch.firstRows[to] : batch.rows) - start;
  const target = windows.target.subarray(0, rows);
  readBatch(spilled, batch, -1, start, target);
  const { final, next } = numbering;
  for (let i = 0; i < rows; i++) {
    const p = target[i];
    target[i] = p >= group.first && p < group.end && final[p] >= 0 ? next[p]++ - group.firstRow : -1;
  }
  spilled.stored.forEach((column, index) => {
    const out = held[columns.indexOf(column)];
    const Type = out.constructor as new (buffer: ArrayBuffer, offset: number, length: number) => Column;
    const values = new Type(windows.bytes, 0, rows);
    readBatch(spilled, batch, index, start, values);
    if (column.key === 'frame') {
      const frames = values as Int32Array;
      const time = held[columns.findIndex((each) => each.key === 'time')] as Float64Array;
      for (let i = 0; i < rows; i++) if (target[i] >= 0) keptPerFrame[frames[i]]++;
      scatterTimes(time, target, frames, spilled.frameTime.array);
      scatterNumbers(out as Int32Array, target, frames, spilled.frameNumber.array);
    } else {
      scatterValues(values, target, rows, out);
    }
  });
}

/** Frame indices to the times of the frames. */
function scatterTimes(out: Float64Array, target: Int32Array, frames: Int32Array, times: Float64Array): void {
  for (let i = 0; i < target.length; i++) if (target[i] >= 0) out[target[i]] = times[frames[i]];
}

/** Frame indices to the numbers of the frames. */
function scatterNumbers(out: Int32Array, target: Int32Array, frames: Int32Array, numbers: Int32Array): void {
  for (let i = 0; i < target.length; i++) if (target[i] >= 0) out[target[i]] = numbers[frames[i]];
}

function rowsOf(
  group: Group,
  numbering: Numbering,
  spilled: Spilled,
  columns: readonly SampleColumn[],
  held: readonly Column[],
  pathline: Int32Array,
): PathlineRows {
  const { final } = numbering;
  const starts: number[] = [0];
  let firstPathline = -1;
  for (let p = group.first, row = 0; p < group.end; p++) {
    if (final[p] < 0) continue;
    if (firstPathline < 0) firstPathline = final[p];
    const end = row + spilled.counts.array[p];
    pathline.fill(final[p], row, end);
    row = end;
    starts.push(row);
  }
  const named: Record<string, Column> = {};
  columns.forEach((column, index) => {
    named[column.key] = held[index].subarray(0, group.rows);
  });
  return {
    dims: columns.some((column) => column.key === 'z') ? 3 : 2,
    firstPathline,
    firstRow: group.firstRow,
    offsets: Uint32Array.from(starts),
    pathline: pathline.subarray(0, group.rows),
    z: NONE.f64,
    w: NONE.f32,
    ax: NONE.f32,
    ay: NONE.f32,
    az: NONE.f32,
    zSe: NONE.f32,
    wSe: NONE.f32,
    axSe: NONE.f32,
    aySe: NONE.f32,
    azSe: NONE.f32,
    measuredZ: NONE.f64,
    ...named,
  } as PathlineRows;
}
