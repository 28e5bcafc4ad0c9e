import type { DetectionBlock, Dims } from '../core/columns.js';
import type { RunContext } from '../core/context.js';

/** One file of a dump, for provenance. */
export interface DumpFile {
  readonly name: string;
  readonly bytes: number;
  readonly modified: string | null;
  /** SHA-256 of the file as it lies on disk (compressed where it is compressed), hex. */
  readonly sha256: string;
}

/** Why a row was set aside. */
export type RowReason =
  | 'wrong-field-count'
  | 'not-a-number'
  | 'not-finite'
  | 'frame-not-whole'
  | 'frame-out-of-range'
  | 'same-place'
  | 'time-not-finite';

/** Rows set aside for one reason: how many, and the first few by place. */
export interface SetAside {
  readonly reason: RowReason;
  readonly count: number;
  /** At most five: `file`, 1-based `line` (0 where the format has no lines), what was found. */
  readonly examples: readonly { readonly file: string; readonly line: number; readonly found: string }[];
}

/** What a first pass over the whole dump found. Cost: one pass, constant memory but for one entry a frame. */
export interface DumpScan {
  readonly files: readonly DumpFile[];
  readonly format: 'text' | 'npy' | 'hdf5' | 'parquet';
  readonly dims: Dims;
  readonly has: { readonly brightness: boolean; readonly pathline: boolean; readonly time: boolean };
  /** How each column was found: `x: column 3 "x_px"`. */
  readonly columns: Readonly<Record<string, string>>;
  /** Data rows in all, rows read, rows set aside: rowsRead + sum of setAside = rowsPresent. */
  readonly rowsPresent: number;
  readonly rowsRead: number;
  readonly setAside: readonly SetAside[];
  /** Distinct frame numbers with at least one detection, ascending, and detections in each. */
  readonly frameNumbers: Int32Array;
  readonly frameCounts: Uint32Array;
  /** Median step of the time column a frame number, in s as written; NaN without that column or a second frame. */
  readonly timeStep: number;
  /** True when rows already stand in frame order, so that the dump can be streamed. */
  readonly ordered: boolean;
  /** Smallest and largest coordinate, dump units; NaN for z in the plane. */
  readonly bounds: { readonly min: readonly [number, number, number]; readonly max: readonly [number, number, number] };
  /** Plain sentences for the user: decimal commas taken, header found, byte-order mark skipped ... */
  readonly remarks: readonly string[];
}

/** An opened dump. `scan` must have settled before `blocks` is called. */
export interface Dump {
  scan(context: RunContext): Promise<DumpScan>;
  /**
   * Detections in frame order, each block at least one whole frame, at most about `rows` rows unless a single
   * frame holds more. Two rows of one frame at exactly the same place: the first is kept, the others are set
   * aside (`same-place`). Rows out of frame order are put in order within the RAM limit, else `dump/order-needs-ram`.
   */
  blocks(context: RunContext, rows?: number): AsyncGenerator<DetectionBlock>;
}
