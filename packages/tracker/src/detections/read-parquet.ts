import { decompress } from 'fzstd';
import { type FileMetaData, parquetMetadataAsync, parquetRead, parquetSchema } from 'hyparquet';
import type { ByteSource } from '../core/bytes.js';
import { isWakeloomError, WakeloomError } from '../core/errors.js';
import { readFrom } from './byte-stream.js';
import { planColumns } from './column-plan.js';
import type { DumpPass } from './dump-pass.js';
import { BATCH_ROWS } from './row-batch.js';

/** Rows of one group held at a time; larger groups would need more memory than a reading should take. */
const GROUP_ROWS = 1 << 24;

const CODECS = new Set(['UNCOMPRESSED', 'SNAPPY', 'ZSTD']);

/**
 * Reads a Parquet file with flat numeric columns, row group by row group; a missing value is NaN. Compression: none,
 * snappy, zstd. Yields whenever `pass.batch` holds rows. Memory: the wanted columns of one row group.
 *
 * Throws `dump/corrupt-parquet`, `dump/parquet-codec`, `dump/parquet-group`, `dump/column-not-numeric`.
 */
export async function* readParquet(source: ByteSource, pass: DumpPass): AsyncGenerator<void> {
  const name = source.name;
  const file = {
    byteLength: source.size,
    slice: async (start: number, end: number = source.size) => {
      if (!(start >= 0 && end >= start && end <= source.size)) throw new Error(`bytes ${start} to ${end} do not exist`);
      const bytes = new Uint8Array(end - start);
      if ((await readFrom(source, start, bytes)) !== bytes.length) throw new Error(`the file ends before byte ${end}`);
      return bytes.buffer;
    },
  };
  const metadata = await guard(name, async () => parquetMetadataAsync(file, { geoparquet: false }));
  const names = await guard(name, async () => parquetSchema(metadata).children.map((child) => child.element.name));
  const plan = planColumns(
    {
      file: name,
      names,
      count: names.length,
      firstIsWhole: false,
      needsFrame: pass.settings.layout === 'one-file-a-run',
    },
    pass.settings.columns,
  );
  pass.agreeColumns(name, plan);
  const wanted = [...plan.index].flatMap((at, role) => (at < 0 ? [] : [{ role, name: names[at] }]));
  const columns = wanted.map((column) => column.name);
  await guard(name, async () => refuse(metadata, columns, name));
  const total = Number(metadata.num_rows);
  const { batch, ledger } = pass;
  let groupStart = 0;
  for (const group of metadata.row_groups) {
    const rows = Number(group.num_rows);
    const held = new Map(columns.map((column) => [column, new Float64Array(rows)]));
    const got = new Map(columns.map((column) => [column, 0]));
    await guard(name, async () => {
      let fault: unknown = null;
      const range = { rowStart: groupStart, rowEnd: groupStart + rows };
      await parquetRead({
        file,
        metadata,
        columns,
        ...range,
        compressors: { ZSTD: (input) => decompress(input) },
        onChunk: ({ columnName, columnData, rowStart }) => {
          // What is thrown here would get lost in the library's own promise.
          try {
            const into = held.get(columnName);
            if (into === undefined) return;
            got.set(
              columnName,
              (got.get(columnName) ?? 0) + copy(columnData, rowStart - groupStart, into, columnName, name),
            );
          } catch (error) {
            fault ??= error;
          }
        },
      });
      if (fault !== null) throw fault;
      for (const [column, count] of got) {
        if (count !== rows) throw new Error(`${count} values of ${column} instead of ${rows}`);
      }
    });
    for (let row = 0; row < rows; row += BATCH_ROWS) {
      const part = Math.min(BATCH_ROWS, rows - row);
      for (const { role, name: column } of wanted) {
        batch.columns[role].set((held.get(column) as Float64Array).subarray(row, row + part));
      }
      for (let i = 0; i < part; i++) batch.row[i] = ledger.rowsPresent++;
      batch.line.fill(0, 0, part);
      batch.rows = part;
      pass.advance(Math.round((part / total) * source.size));
      yield;
      await pass.context.breathe();
    }
    groupStart += rows;
  }
}

function refuse(metadata: FileMetaData, columns: readonly string[], file: string): void {
  let sum = 0;
  for (const group of metadata.row_groups) {
    const rows = Number(group.num_rows);
    if (!Number.isSafeInteger(rows) || rows < 0) throw new Error(`a row group of ${rows} rows`);
    sum += rows;
    if (rows > GROUP_ROWS) {
      throw new WakeloomError(
        'dump/parquet-group',
        `Parquet row group too large: got ${rows} rows, expected at most ${GROUP_ROWS}; write the file with smaller row groups (${file})`,
        { file, rows },
      );
    }
    for (const { meta_data: column } of group.columns) {
      if (column === undefined || !columns.includes(column.path_in_schema[0])) continue;
      if (!CODECS.has(column.codec)) {
        throw new WakeloomError(
          'dump/parquet-codec',
          `Parquet compression: got ${column.codec}, expected none, snappy or zstd; write the file with one of these (${file})`,
          { file, codec: column.codec },
        );
      }
    }
  }
  if (sum !== Number(metadata.num_rows)) throw new Error(`${sum} rows in groups instead of ${metadata.num_rows}`);
}

/** Copies what lies within the group; returns how many values. */
function copy(data: ArrayLike<unknown>, start: number, into: Float64Array, column: string, file: string): number {
  let copied = 0;
  for (let i = Math.max(0, -start); i < data.length && start + i < into.length; i++) {
    const value = data[i];
    if (typeof value === 'number') into[start + i] = value;
    else if (typeof value === 'bigint') into[start + i] = Number(value);
    else if (value === null || value === undefined) into[start + i] = Number.NaN;
    else {
      throw new WakeloomError(
        'dump/column-not-numeric',
        `column not numeric: got ${typeof value === 'object' ? 'a nested or dated value' : typeof value} in "${column}", expected numbers (${file})`,
        { file, column },
      );
    }
    copied++;
  }
  return copied;
}

/** The library throws plain errors on damaged files: they get a code and the file's name. */
async function guard<T>(file: string, call: () => Promise<T>): Promise<T> {
  try {
    return await call();
  } catch (error) {
    if (isWakeloomError(error)) throw error;
    const what = error instanceof Error ? error.message : String(error);
    throw new WakeloomError(
      'dump/corrupt-parquet',
      `Parquet file corrupt: got "${what}", expected a whole Parquet file; copy the file again (${file})`,
      { file },
      error,
    );
  }
}
