import type { DetectionBlock } from '../core/columns.js';
import { WakeloomError } from '../core/errors.js';
import type { DumpPass } from './dump-pass.js';
import type { FrameFinisher } from './frame-finisher.js';
import type { FrameSeen } from './frame-gatherer.js';
import { FrameTable } from './frame-table.js';
import { readBatches } from './read-batches.js';
import { ROLE } from './row-batch.js';
import { bytesARow, type RowShape, RowStore } from './row-store.js';

/** Bytes that one frame takes beside its rows while rows are put in order: table, offsets, numbers, times. */
const BYTES_A_FRAME = 64;

/**
 * Throws `dump/order-needs-ram` when putting the rows in frame order would take more than the limit.
 */
export function refuseOverLimit(rows: number, frames: number, shape: RowShape, limit: number, where: string): void {
  const need = rows * bytesARow(shape) + frames * BYTES_A_FRAME;
  if (need <= limit) return;
  const mb = (bytes: number) => `${Math.ceil(bytes / 1e6)} MB`;
  throw new WakeloomError(
    'dump/order-needs-ram',
    `rows not in frame order: got ${rows} rows that need ${mb(need)} to be put in order, expected at most ${mb(limit)}, half of the RAM limit; give --ram-limit "${mb(2 * need)}" or sort the dump by frame (${where})`,
    { rows, need, limit },
  );
}

/** A dump whose rows came out of frame order, held whole in frame order. */
export class OrderedRows {
  readonly numbers: Int32Array;
  readonly times: Float64Array;
  /** First row of each frame in the store. [frames + 1] */
  readonly offsets: Uint32Array;
  readonly #store: RowStore;

  private constructor(numbers: Int32Array, times: Float64Array, offsets: Uint32Array, store: RowStore) {
    this.numbers = numbers;
    this.times = times;
    this.offsets = offsets;
    this.#store = store;
  }

  /**
   * Reads the dump once more and puts each row at its place: a counting sort by frame, stable, so that rows of one
   * frame keep their reading order. `numbers` ascend, `counts` are the rows of each frame as counted by the first
   * reading. Throws `dump/changed` when the dump no longer holds those rows.
   */
  static async collect(
    pass: DumpPass,
    numbers: Int32Array,
    counts: Uint32Array,
    shape: RowShape,
    finisher: FrameFinisher,
    seen: FrameSeen,
  ): Promise<OrderedRows> {
    const starts = new Uint32Array(numbers.length + 1);
    for (let k = 0; k < counts.length; k++) starts[k + 1] = starts[k] + counts[k];
    const total = starts[numbers.length];
    const store = new RowStore(shape, total);
    const cursors = FrameTable.from(numbers, starts);
    const frame = pass.batch.columns[ROLE.frame];
    let placed = 0;
    for await (const _ of readBatches(pass)) {
      const rows = pass.batch.rows;
      for (let i = 0; i < rows; ) {
        let end = i + 1;
        while (end < rows && frame[end] === frame[i]) end++;
        placed += end - i;
        const at = placed > total ? total : cursors.add(frame[i], end - i);
        if (at + end - i > total) throw changed(pass);
        store.put(at, pass.batch, i, end);
        i = end;
      }
    }
    if (placed !== total || cursors.size !== numbers.length) throw changed(pass);
    const ends = cursors.sorted().values;
    for (let k = 0; k < ends.length; k++) if (ends[k] !== starts[k + 1]) throw changed(pass);

    const times = new Float64Array(numbers.length).fill(Number.NaN);
    const offsets = new Uint32Array(numbers.length + 1);
    let write = 0;
    for (let k = 0; k < numbers.length; k++) {
      const end = finisher.finish(store, numbers[k], starts[k], starts[k + 1]);
      seen(store, numbers[k], starts[k], end, k === 0 ? null : numbers[k - 1], finisher.time);
      times[k] = finisher.time;
      if (write === starts[k]) write = end;
      else for (let row = starts[k]; row < end; row++) store.move(row, write++);
      offsets[k + 1] = write;
      if (k % 256 === 0) await pass.context.breathe();
    }
    store.line = new Uint32Array(0);
    return new OrderedRows(numbers, times, offsets, store);
  }

  /** Forgets z, for rows that turned out to lie in one plane. */
  flatten(): void {
    this.#store.flatten();
  }

  /** New block of whole frames from frame index `first` on, at most `rows` rows unless one frame holds more. */
  block(first: number, rows: number): DetectionBlock {
    const offsets = this.offsets;
    let last = first + 1;
    while (last < this.numbers.length && offsets[last + 1] - offsets[first] <= rows) last++;
    const own = new Uint32Array(last - first + 1);
    for (let k = 0; k < own.length; k++) own[k] = offsets[first + k] - offsets[first];
    const numbers = this.numbers.slice(first, last);
    return this.#store.block(offsets[first], offsets[last], numbers, this.times.slice(first, last), own);
  }
}

/** The dump gave other rows than before. */
export function changed(pass: DumpPass): WakeloomError {
  return new WakeloomError(
    'dump/changed',
    `dump changed while it was read: got other content in the second reading, expected that of the first; start again when nothing writes to it (${pass.files[0].name})`,
    { file: pass.files[0].name },
  );
}
