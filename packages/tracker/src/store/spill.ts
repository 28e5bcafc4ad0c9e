import type { ScratchFile } from '../core/bytes.js';
import type { SampleBlock } from '../core/columns.js';
import { rowCount } from '../core/columns.js';
import { WakeloomError } from '../core/errors.js';
import type { ResultPlace } from '../core/result-place.js';
import { checkRoom } from './disk-space.js';
import { type Growable, growable } from './growable.js';
import type { SampleColumn } from './sample-columns.js';

/** Rows sorted and written at once: about 13 MB in the plane, and again as much while they are sorted. */
const BATCH_ROWS = 1 << 17;

/**
 * Pathlines of a bucket. Small, so that a bucket of very long pathlines stays small; a batch holds only the buckets
 * of the particles then in view, so that there are some hundreds of pieces a batch whatever the run's length.
 */
export const BUCKET_PATHLINES = 64;

export type Column = Float64Array | Float32Array | Int32Array | Uint16Array;

/** One batch in a scratch file: columns one after the other, each of `rows` values. */
export interface Batch {
  readonly position: number;
  readonly rows: number;
  /** Buckets present, ascending, and the first row of each; rows of a bucket are in frame order. */
  readonly buckets: Int32Array;
  readonly firstRows: Int32Array;
}

/** What was spilled, to be read again in `finish`. */
export interface Spilled {
  /** All columns and the pathline number, each batch sorted by bucket. */
  readonly samples: ScratchFile;
  readonly batches: readonly Batch[];
  /** The columns that frames.nc shows, in frame order. */
  readonly frames: ScratchFile | null;
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

/**
 * Opens the spill. Memory: about 26 MB in the plane and 4 bytes a pathline. `frameColumns` are those of `columns`
 * that frames.nc takes (empty: no frames.nc).
 */
export function openSpill(
  place: ResultPlace,
  columns: readonly SampleColumn[],
  frameColumns: readonly SampleColumn[],
): Spill {
  const samples = place.scratch.create('samples');
  const frames = frameColumns.length > 0 ? place.scratch.create('frames') : null;
  const batches: Batch[] = [];
  const counts = growable(Int32Array);
  const frameNumber = growable(Int32Array);
  const frameTime = growable(Float64Array);
  const frameRows = growable(Int32Array);
  let staged = columns.map((column) => columnOf(column.stored, BATCH_ROWS));
  let stagedPathline = new Int32Array(BATCH_ROWS);
  let sorted = new Float64Array(BATCH_ROWS);
  let slots = new Int32Array(BATCH_ROWS);
  let used = 0;
  let frameRowBytes = rowBytes(frameColumns) + 4;
  if (frames === null) frameRowBytes = 0;

  const bytesOf = (array: Column, rows: number) =>
    new Uint8Array(array.buffer, array.byteOffset, rows * array.BYTES_PER_ELEMENT);

  const flush = () => {
    if (used === 0) return;
    checkRoom(place, used * (rowBytes(columns) + 4 + frameRowBytes));
    if (frames !== null) {
      frames.append(bytesOf(stagedPathline, used));
      for (const column of frameColumns) frames.append(bytesOf(staged[columns.indexOf(column)], used));
    }
    const { buckets, firstRows } = sortByBucket(stagedPathline, used, slots);
    batches.push({ position: samples.length, rows: used, buckets, firstRows });
    for (const source of [stagedPathline, ...staged]) {
      const Type = source.constructor as new (buffer: ArrayBufferLike, offset: number, length: number) => Column;
      const target = new Type(sorted.buffer, 0, used);
      for (let i = 0; i < used; i++) target[slots[i]] = source[i];
      samples.append(bytesOf(target, used));
    }
    used = 0;
  };

  return {
    add(block) {
      const rows = rowCount(block);
      checkBlock(block, frameNumber);
      for (let frame = 0; frame < block.number.length; frame++) {
        frameNumber.push(block.number[frame]);
        frameTime.push(block.time[frame]);
        frameRows.push(block.offsets[frame + 1] - block.offsets[frame]);
      }
      countPathlines(block.pathline, rows, counts);
      let frame = 0;
      for (let first = 0; first < rows; ) {
        const end = Math.min(rows, first + BATCH_ROWS - used);
        stagedPathline.set(block.pathline.subarray(first, end), used);
        columns.forEach((column, index) => {
          if (column.key === 'frame' || column.key === 'time') return;
          staged[index].set(block[column.key].subarray(first, end), used);
        });
        const number = staged[columns.findIndex((column) => column.key === 'frame')];
        const time = staged[columns.findIndex((column) => column.key === 'time')];
        for (let row = first; row < end; ) {
          while (block.offsets[frame + 1] <= row) frame++;
          const stop = Math.min(end, block.offsets[frame + 1]);
          number.fill(block.number[frame], used + row - first, used + stop - first);
          time.fill(block.time[frame], used + row - first, used + stop - first);
          row = stop;
        }
        used += end - first;
        first = end;
        if (used === BATCH_ROWS) flush();
      }
    },
    finish() {
      flush();
      staged = [];
      stagedPathline = new Int32Array(0);
      sorted = new Float64Array(0);
      slots = new Int32Array(0);
      return { samples, batches, frames, counts, frameNumber, frameTime, frameRows };
    },
    discard() {
      samples.discard();
      frames?.discard();
    },
  };
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

/** Stable counting sort by bucket: row i goes to slots[i]. */
function sortByBucket(
  pathline: Int32Array,
  rows: number,
  slots: Int32Array,
): { buckets: Int32Array; firstRows: Int32Array } {
  let low = Number.POSITIVE_INFINITY;
  let high = -1;
  for (let i = 0; i < rows; i++) {
    if (pathline[i] < low) low = pathline[i];
    if (pathline[i] > high) high = pathline[i];
  }
  const first = Math.floor(low / BUCKET_PATHLINES);
  const next = new Int32Array(Math.floor(high / BUCKET_PATHLINES) - first + 1);
  for (let i = 0; i < rows; i++) next[((pathline[i] / BUCKET_PATHLINES) | 0) - first]++;
  const buckets: number[] = [];
  const firstRows: number[] = [];
  let sum = 0;
  for (let bucket = 0; bucket < next.length; bucket++) {
    const count = next[bucket];
    next[bucket] = sum;
    if (count > 0) {
      buckets.push(first + bucket);
      firstRows.push(sum);
    }
    sum += count;
  }
  for (let i = 0; i < rows; i++) slots[i] = next[((pathline[i] / BUCKET_PATHLINES) | 0) - first]++;
  return { buckets: Int32Array.from(buckets), firstRows: Int32Array.from(firstRows) };
}
