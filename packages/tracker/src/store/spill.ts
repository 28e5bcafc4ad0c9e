import type { ScratchFile } from '../core/bytes.js';
import type { SampleBlock } from '../core/columns.js';
import { rowCount } from '../core/columns.js';
import { WakeloomError } from '../core/errors.js';
import type { ResultPlace } from '../core/result-place.js';
import { sortByBucket } from './bucket-sort.js';
import { checkRoom } from './disk-space.js';
import { type Growable, growable } from './growable.js';
import { scatterValues } from './move-values.js';
import type { SampleColumn, SampleKey } from './sample-columns.js';

/** Rows sorted and written at once: about 13 MB in the plane, and again as much while they are sorted. */
const BATCH_ROWS = 1 << 17;

export type Column = Float64Array | Float32Array | Int32Array | Uint16Array;

/** One batch in a scratch file: pathline numbers, then the columns, one after the other, each of `rows` values. */
export interface Batch {
  readonly position: number;
  readonly rows: number;
  /** Buckets present, ascending, and the first row of each; rows of a bucket are in frame order. */
  readonly buckets: Int32Array;
  readonly firstRows: Int32Array;
}

/** What was spilled, to be read again in `finish`. */
export interface Spilled {
  /** Each batch sorted by bucket. */
  readonly samples: ScratchFile;
  readonly batches: readonly Batch[];
  /** Columns in `samples`: all but the time; `frame` holds the index of the frame. */
  readonly stored: readonly SampleColumn[];
  /** Where each row of a batch went, in frame order: 32-bit row numbers, batch after batch; null: not noted. */
  readonly order: ScratchFile | null;
  /** Samples of each provisional pathline. */
  readonly counts: Growable<Int32Array>;
  readonly frameNumber: Growable<Int32Array>;
  readonly frameTime: Growable<Float64Array>;
  readonly frameRows: Growable<Int32Array>;
}

/** Takes blocks in frame order into scratch files. */
export interface Spill {
  add(block: SampleBlock): void;
  /** Writes what is pending and frees the working memory. */
  finish(): Spilled;
  discard(): void;
}

const BYTES = { f64: 8, f32: 4, i32: 4, u16: 2 } as const;

/** Bytes of one row over these columns, in memory and in scratch files. */
export function rowBytes(columns: readonly SampleColumn[]): number {
  return columns.reduce((sum, column) => sum + BYTES[column.stored], 0);
}

/** A new array of the column's type. */
export function columnOf(stored: SampleColumn['stored'], rows: number): Column {
  if (stored === 'f64') return new Float64Array(rows);
  if (stored === 'f32') return new Float32Array(rows);
  return stored === 'i32' ? new Int32Array(rows) : new Uint16Array(rows);
}

/** Bytes a sample takes in scratch files. */
export function spillBytes(columns: readonly SampleColumn[], withOrder: boolean): number {
  return rowBytes(columns.filter((column) => column.key !== 'time')) + (withOrder ? 8 : 4);
}

/**
 * Opens the spill. Memory: about 13 MB in the plane and 4 bytes a pathline. `withOrder`: note the frame order too,
 * for frames.nc.
 */
export function openSpill(
  place: ResultPlace,
  columns: readonly SampleColumn[],
  withOrder: boolean,
  batchRows = BATCH_ROWS,
): Spill {
  const samples = place.scratch.create('samples');
  const order = withOrder ? place.scratch.create('order') : null;
  // The time follows from the frame: 8 bytes a sample less to write.
  const stored = columns.filter((column) => column.key !== 'time');
  const batches: Batch[] = [];
  const counts = growable(Int32Array);
  const frameNumber = growable(Int32Array);
  const frameTime = growable(Float64Array);
  const frameRows = growable(Int32Array);
  let staged = stored.map((column) => columnOf(column.stored, batchRows));
  let stagedPathline = new Int32Array(batchRows);
  let sorted = new Float64Array(batchRows);
  let slots = new Int32Array(batchRows);
  let used = 0;

  const flush = () => {
    if (used === 0) return;
    checkRoom(place, used * spillBytes(columns, withOrder));
    const { buckets, firstRows } = sortByBucket(stagedPathline, used, slots);
    batches.push({ position: samples.length, rows: used, buckets, firstRows });
    for (const source of [stagedPathline, ...staged]) samples.append(bytesOf(scatter(source, slots, sorted, used)));
    order?.append(bytesOf(slots.subarray(0, used)));
    used = 0;
  };

  return {
    add(block) {
      const rows = rowCount(block);
      checkBlock(block, frameNumber);
      countPathlines(block.pathline, rows, counts);
      const firstFrame = frameNumber.length;
      for (let frame = 0; frame < block.number.length; frame++) {
        frameNumber.push(block.number[frame]);
        frameTime.push(block.time[frame]);
        frameRows.push(block.offsets[frame + 1] - block.offsets[frame]);
      }
      let frame = 0;
      for (let first = 0; first < rows; ) {
        const end = Math.min(rows, first + batchRows - used);
        stagedPathline.set(block.pathline.subarray(first, end), used);
        stored.forEach((column, index) => {
          if (column.key === 'frame') return;
          staged[index].set(block[column.key as SampleKey].subarray(first, end), used);
        });
        const frameIndex = staged[stored.findIndex((column) => column.key === 'frame')];
        for (let row = first; row < end; ) {
          while (block.offsets[frame + 1] <= row) frame++;
          const stop = Math.min(end, block.offsets[frame + 1]);
          frameIndex.fill(firstFrame + frame, used + row - first, used + stop - first);
          row = stop;
        }
        used += end - first;
        first = end;
        if (used === batchRows) flush();
      }
    },
    finish() {
      flush();
      staged = [];
      stagedPathline = new Int32Array(0);
      sorted = new Float64Array(0);
      slots = new Int32Array(0);
      return { samples, batches, stored, order, counts, frameNumber, frameTime, frameRows };
    },
    discard() {
      samples.discard();
      order?.discard();
    },
  };
}

function bytesOf(array: Column): Uint8Array {
  return new Uint8Array(array.buffer, array.byteOffset, array.byteLength);
}

/** Row i of `source` at slots[i], as a view of `room`. */
function scatter(source: Column, slots: Int32Array, room: Float64Array, rows: number): Column {
  const Type = source.constructor as new (buffer: ArrayBufferLike, offset: number, length: number) => Column;
  const target = new Type(room.buffer, 0, rows);
  scatterValues(source, slots, rows, target);
  return target;
}

/** Reads rows start .. start + into.length - 1 of a batch: of stored column `index`, or of the pathline numbers for -1. */
export function readBatch(spilled: Spilled, batch: Batch, index: number, start: number, into: Column): void {
  const before = index < 0 ? 0 : 4 + rowBytes(spilled.stored.slice(0, index));
  const position = batch.position + before * batch.rows + into.BYTES_PER_ELEMENT * start;
  spilled.samples.read(position, bytesOf(into));
}

function checkBlock(block: SampleBlock, frameNumber: Growable<Int32Array>): void {
  let last = frameNumber.length === 0 ? Number.NEGATIVE_INFINITY : frameNumber.array[frameNumber.length - 1];
  for (const number of block.number) {
    if (number <= last) {
      throw new WakeloomError(
        'store/bad-block',
        `block of samples: got frame ${number} after frame ${last}, expected ascending frames (result writer)`,
        { frame: number, after: last },
      );
    }
    last = number;
  }
}

function countPathlines(pathline: Int32Array, rows: number, counts: Growable<Int32Array>): void {
  let largest = counts.length - 1;
  for (let row = 0; row < rows; row++) {
    if (pathline[row] < 0) {
      throw new WakeloomError(
        'store/bad-block',
        `block of samples: got pathline ${pathline[row]} in row ${row}, expected 0 or more (result writer)`,
        { row, pathline: pathline[row] },
      );
    }
    if (pathline[row] > largest) largest = pathline[row];
  }
  counts.extend(largest + 1);
  const { array } = counts;
  for (let row = 0; row < rows; row++) array[pathline[row]]++;
}
