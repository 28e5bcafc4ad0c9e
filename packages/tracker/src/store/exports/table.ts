import type { ByteSink } from '../../core/bytes.js';
import type { RunContext } from '../../core/context.js';
import type { NumericArray } from '../../core/hdf5.js';

/** How a column of an export is stored; `i64` values are whole numbers below 2^53. */
export type ExportType = 'i32' | 'i64' | 'f32' | 'f64';

/** One column of an export. */
export interface ExportColumn {
  readonly name: string;
  readonly type: ExportType;
  /** `mm/s`, `1` where there is none. */
  readonly unit: string;
  /** False where the result has no such figure (accelerations of image pairs): empty in CSV, NaN elsewhere. */
  readonly present: boolean;
}

/** Rows and columns of an export, read in pieces; values are as they are to be written (normalised if asked). */
export interface ExportTable {
  readonly columns: readonly ExportColumn[];
  /** Sizes, slowest first: `[samples]` for pathlines, `[ny, nx]` or `[nz, ny, nx]` for a grid. */
  readonly shape: readonly number[];
  readonly rows: number;
  /** Rows start .. end - 1 of a column, valid until the next call; NaN throughout where it is not present. */
  read(column: number, start: number, end: number): NumericArray | Promise<NumericArray>;
}

/** What an exporter is told beside the data. */
export interface ExportSettings {
  /** Rows held at a time; the default suits formats and memory alike. */
  readonly rows?: number;
  readonly context?: RunContext;
}

/** What was written. */
export interface ExportSummary {
  readonly rows: number;
  readonly columns: readonly string[];
  readonly bytes: number;
  /** Plain sentences for the user: what is empty and why, what the figures are divided by. */
  readonly remarks: readonly string[];
}

/** Rows read at a time unless asked otherwise: some 3 MB with all columns. */
export const EXPORT_ROWS = 16384;

/** Counts the bytes that go into a sink. */
export interface CountedSink {
  write(bytes: Uint8Array): Promise<void>;
  readonly bytes: number;
}

/** A view on `sink` that counts; it does not close it. */
export function counted(sink: ByteSink): CountedSink {
  let bytes = 0;
  return {
    async write(chunk) {
      await sink.write(chunk);
      bytes += chunk.length;
    },
    get bytes() {
      return bytes;
    },
  };
}

/**
 * Every column of consecutive rows, piece by piece in the order of the table, copied so that a piece stays valid.
 * Reports progress as `export` and lets an abort through.
 */
export async function* pieces(
  table: ExportTable,
  settings: ExportSettings,
): AsyncGenerator<{ readonly start: number; readonly end: number; readonly values: readonly NumericArray[] }> {
  const step = settings.rows ?? EXPORT_ROWS;
  for (let start = 0; start < table.rows; start += step) {
    const end = Math.min(table.rows, start + step);
    const values: NumericArray[] = [];
    for (let c = 0; c < table.columns.length; c++) values.push((await table.read(c, start, end)).slice());
    yield { start, end, values };
    settings.context?.progress('export', end, table.rows, 'rows');
    await settings.context?.breathe();
  }
}
