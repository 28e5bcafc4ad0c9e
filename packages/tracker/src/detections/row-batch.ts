/** What a column of a dump can mean, in the order in which batches carry them. */
export const ROLES = ['frame', 'x', 'y', 'z', 'brightness', 'pathline', 'time'] as const;

export type Role = (typeof ROLES)[number];

/** Position of each role in `RowBatch.columns`. */
export const ROLE = { frame: 0, x: 1, y: 2, z: 3, brightness: 4, pathline: 5, time: 6 } as const;

/** Rows read at a time: large enough that the calls round a batch cost nothing, small enough for the second-level cache. */
export const BATCH_ROWS = 8192;

/**
 * Rows as a format reader hands them on: numbers by role, not yet judged. Owned by the reader and filled anew for
 * each batch; whoever receives it takes what it needs before asking for the next.
 */
export interface RowBatch {
  rows: number;
  /** One array a role (see ROLE), `BATCH_ROWS` long; undefined contents where `used` is 0. NaN where a value is missing. */
  readonly columns: readonly Float64Array[];
  /** 1 for each role the dump carries. */
  readonly used: Uint8Array;
  /** 1-based line of each row; 0 in formats without lines. */
  readonly line: Uint32Array;
  /** 0-based data row over all files in reading order, rows set aside included. */
  readonly row: Float64Array;
}

export function createRowBatch(): RowBatch {
  return {
    rows: 0,
    columns: ROLES.map(() => new Float64Array(BATCH_ROWS)),
    used: new Uint8Array(ROLES.length),
    line: new Uint32Array(BATCH_ROWS),
    row: new Float64Array(BATCH_ROWS),
  };
}
