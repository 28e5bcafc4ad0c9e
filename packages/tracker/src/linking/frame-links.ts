/** Took no detection; ended, because its link was left out for its risk. */
export const NONE = -1;
export const ENDED = -2;

/** Links of one frame as they stand: column of each active pathline, pathline of each column, risk of each column's link. */
export class FrameLinks {
  entries = 0;
  columns = 0;
  /** Column (row - first row of the frame) of each active pathline, NONE or ENDED. */
  took = new Int32Array(0);
  /** Active pathline of each column, NONE: free. */
  takenBy = new Int32Array(0);
  risk = new Float64Array(0);
  /** 1: made by relaxation, not from a prediction. */
  relaxed = new Uint8Array(0);

  begin(entries: number, columns: number): void {
    this.entries = entries;
    this.columns = columns;
    if (this.took.length < entries) this.took = new Int32Array(entries * 2);
    if (this.takenBy.length < columns) {
      this.takenBy = new Int32Array(columns * 2);
      this.risk = new Float64Array(columns * 2);
      this.relaxed = new Uint8Array(columns * 2);
    }
    this.took.fill(NONE, 0, entries);
    this.takenBy.fill(NONE, 0, columns);
    this.risk.fill(0, 0, columns);
    this.relaxed.fill(0, 0, columns);
  }

  link(entry: number, column: number, risk: number): void {
    this.took[entry] = column;
    this.takenBy[column] = entry;
    this.risk[column] = risk;
  }

  /** Takes the link of an active pathline back. */
  release(entry: number): void {
    const column = this.took[entry];
    this.took[entry] = NONE;
    if (column < 0) return;
    this.takenBy[column] = NONE;
    this.risk[column] = 0;
  }
}
