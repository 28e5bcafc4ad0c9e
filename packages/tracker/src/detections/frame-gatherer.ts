import type { DetectionBlock } from '../core/columns.js';
import type { FrameFinisher } from './frame-finisher.js';
import { ROLE, type RowBatch } from './row-batch.js';
import { type RowShape, RowStore } from './row-store.js';

/** Where a frame number came after a larger one. */
export interface OutOfOrder {
  readonly frame: number;
  readonly after: number;
  readonly row: number;
  readonly line: number;
}

/** Called when a frame is whole: its number, its rows in the store, the number of the frame before (null: none), its time. */
export type FrameSeen = (
  store: RowStore,
  frame: number,
  from: number,
  to: number,
  previous: number | null,
  time: number,
) => void;

/**
 * Puts batches of rows that stand in frame order together to whole frames. Memory: the frames since the last
 * `take` or `drop`.
 */
export class FrameGatherer {
  /** Set when a frame number goes down; nothing can be fed after that. */
  outOfOrder: OutOfOrder | null = null;
  /** True when whole frames of at least the target number of rows wait for `take` or `drop`. */
  due = false;
  readonly #store: RowStore;
  readonly #finisher: FrameFinisher;
  readonly #target: number;
  readonly #seen: FrameSeen;
  #rows = 0;
  #open = false;
  #frameStart = 0;
  #current = 0;
  #previous: number | null = null;
  #numbers: number[] = [];
  #times: number[] = [];
  #offsets: number[] = [0];

  constructor(shape: RowShape, target: number, finisher: FrameFinisher, seen: FrameSeen = () => {}) {
    this.#store = new RowStore(shape, Math.max(1024, Math.min(target, 1 << 16) + 8192));
    this.#finisher = finisher;
    this.#target = target;
    this.#seen = seen;
  }

  /** Takes rows of the batch from `from` on; returns the first one not taken, short of `batch.rows` only when `due` or out of order. */
  feed(batch: RowBatch, from: number): number {
    const frame = batch.columns[ROLE.frame];
    let i = from;
    while (i < batch.rows) {
      const number = frame[i];
      if (this.#open && number !== this.#current) {
        if (number < this.#current) {
          this.outOfOrder = { frame: number, after: this.#current, row: batch.row[i], line: batch.line[i] };
          return i;
        }
        this.endFrame();
        if (this.due) return i;
      }
      if (!this.#open) {
        this.#open = true;
        this.#current = number;
        this.#frameStart = this.#rows;
      }
      let end = i + 1;
      while (end < batch.rows && frame[end] === number) end++;
      this.#store.reserve(this.#rows + end - i);
      this.#store.put(this.#rows, batch, i, end);
      this.#rows += end - i;
      i = end;
    }
    return i;
  }

  /** Ends the open frame; to be called after the last batch too. */
  endFrame(): void {
    if (!this.#open) return;
    this.#open = false;
    this.#rows = this.#finisher.finish(this.#store, this.#current, this.#frameStart, this.#rows);
    this.#seen(this.#store, this.#current, this.#frameStart, this.#rows, this.#previous, this.#finisher.time);
    this.#previous = this.#current;
    this.#numbers.push(this.#current);
    this.#times.push(this.#finisher.time);
    this.#offsets.push(this.#rows);
    this.due = this.#rows >= this.#target;
  }

  /** The whole frames as a new block, or null when there are none; starts afresh. No frame may be open. */
  take(): DetectionBlock | null {
    if (this.#numbers.length === 0) return null;
    const block = this.#store.block(
      0,
      this.#rows,
      Int32Array.from(this.#numbers),
      Float64Array.from(this.#times),
      Uint32Array.from(this.#offsets),
    );
    this.drop();
    return block;
  }

  /** Forgets the whole frames. No frame may be open. */
  drop(): void {
    this.#rows = 0;
    this.#numbers = [];
    this.#times = [];
    this.#offsets = [0];
    this.due = false;
  }
}
