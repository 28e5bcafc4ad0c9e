import type { RowLedger } from './row-ledger.js';
import type { RowStore } from './row-store.js';
import { SamePlace } from './same-place.js';

/** A row whose time is not that of its frame, or a frame whose time does not ascend: how many, and the first. */
export interface TimeTrouble {
  count: number;
  frame: number;
  row: number;
  line: number;
}

const noTrouble = (): TimeTrouble => ({ count: 0, frame: 0, row: 0, line: 0 });

/** What happens to a frame once all its rows are together, the same in both passes and in either order of rows. */
export class FrameFinisher {
  /** Time of the frame finished last, NaN without a time column. */
  time = Number.NaN;
  /** Rows whose time differs from that of their frame. */
  readonly offTime = noTrouble();
  /** Frames whose time is not larger than that of the frame before. */
  readonly backwards = noTrouble();
  readonly #ledger: RowLedger;
  readonly #fileOf: (row: number) => string;
  readonly #samePlace = new SamePlace();
  #previousTime = Number.NEGATIVE_INFINITY;

  /** `fileOf` names the file of a data row. */
  constructor(ledger: RowLedger, fileOf: (row: number) => string) {
    this.#ledger = ledger;
    this.#fileOf = fileOf;
  }

  /**
   * Finishes the rows `from .. to - 1` of one frame in place: rows at exactly the place of an earlier one are set
   * aside, the rest close up. Returns the new end. The frame's time is that of most of its rows (Boyer & Moore 1991,
   * doi:10.1007/978-94-011-3488-0_5), so that one corrupt value does not move the frame.
   */
  finish(store: RowStore, frame: number, from: number, to: number): number {
    let kept = to;
    this.#samePlace.search(store.x, store.y, store.z, from, to, (row) => {
      this.#ledger.setAside('same-place', this.#fileOf(store.row[row]), store.line[row], () => {
        const z = store.shape.z ? `, ${store.z[row]}` : '';
        return `(${store.x[row]}, ${store.y[row]}${z}) again in frame ${frame}, data row ${store.row[row]}`;
      });
      // Marked now, removed below: the search still compares with earlier rows.
      if (kept === to) kept = row;
      store.row[row] = -1;
    });
    if (kept < to) {
      for (let row = kept + 1; row < to; row++) if (store.row[row] >= 0) store.move(row, kept++);
    }
    if (store.shape.time) this.#settleTime(store, frame, from, kept);
    return kept;
  }

  #settleTime(store: RowStore, frame: number, from: number, to: number): void {
    let time = store.time[from];
    let votes = 0;
    for (let row = from; row < to; row++) {
      if (votes === 0) time = store.time[row];
      votes += store.time[row] === time ? 1 : -1;
    }
    for (let row = from; row < to; row++) {
      if (store.time[row] !== time) note(this.offTime, frame, store.row[row], store.line[row]);
    }
    if (time <= this.#previousTime) note(this.backwards, frame, store.row[from], store.line[from]);
    this.#previousTime = time;
    this.time = time;
  }
}

function note(trouble: TimeTrouble, frame: number, row: number, line: number): void {
  if (trouble.count === 0) {
    trouble.frame = frame;
    trouble.row = row;
    trouble.line = line;
  }
  trouble.count++;
}
