import { type FileMetaData, parquetMetadataAsync, parquetSchema, type SchemaTree } from 'hyparquet';
import type { ByteSource } from '../core/bytes.js';
import { isWakeloomError, WakeloomError } from '../core/errors.js';
import { readFrom } from './byte-stream.js';
import { planColumns } from './column-plan.js';
import type { DumpPass } from './dump-pass.js';
import { decodeParquetColumn, isParquetNumber, type ParquetChunk, UnknownEncoding } from './parquet-column.js';
import { BATCH_ROWS } from './row-batch.js';

/** Rows of one group held at a time; larger groups would need more memory than a reading should take. */
const GROUP_ROWS = 1 << 24;

const CODECS = new Set(['UNCOMPRESSED', 'SNAPPY', 'ZSTD']);

/** Meanings that are numbers as they stand; a date, a decimal or an enumeration is none. */
const PLAIN_MEANING = /^(U?INT_(8|16|32|64))$/;

/**
 * Reads a Parquet file with flat numeric columns, row group by row group; a missing value is NaN. Compression: none,
 * snappy, zstd; encodings as in parquet-column.ts. Yields whenever `pass.batch` holds rows. Memory: the wanted
 * columns of one row group. The footer is read by hyparquet, the pages by our own decoder: that of the library loops
 * or fills memory without bound on damaged pages.
 *
 * Throws `dump/corrupt-parquet`, `dump/parquet-codec`, `dump/parquet-encoding`, `dump/parquet-group`,
 * `dump/column-not-numeric`.
 */
export async function* readParquet(source: ByteSource, pass: DumpPass): AsyncGenerator<void> {
  const file = source.name;
  const slice = async (start: number, end: number = source.size) => {
    if (!(start >= 0 && end >= start && end <= source.size)) throw new Error(`bytes ${start} to ${end} do not exist`);
    const bytes = new Uint8Array(end - start);
    if ((await readFrom(source, start, bytes)) !== bytes.length) throw new Error(`the file ends before byte ${end}`);
    return bytes;
  };
  const buffer = {
    byteLength: source.size,
    slice: async (start: number, end?: number) => (await slice(start, end)).buffer,
  };
  const metadata = await guard(file, () => parquetMetadataAsync(buffer, { geoparquet: false }));
  const schema = await guard(file, async () => parquetSchema(metadata).children);
  const names = schema.map((child) => String(child.element.name));
  const plan = planColumns(
    {
      file,
      names,
      count: names.length,
      firstIsWhole: false,
      needsFrame: pass.settings.layout === 'one-file-a-run',
      timesAreClock: pass.settings.timesAreClock,
    },
    pass.settings.columns,
  );
  pass.agreeColumns(file, plan);
  const wanted = [...plan.index].flatMap((at, role) => (at < 0 ? [] : [{ role, name: names[at], tree: schema[at] }]));
  await guard(file, async () => {
    refuseGroups(metadata, file);
    for (const { name, tree } of wanted) refuseColumn(name, tree, file);
  });
  const total = Number(metadata.num_rows);
  const { batch, ledger, context } = pass;
  for (const group of metadata.row_groups) {
    const rows = Number(group.num_rows);
    const columns: Float64Array[] = [];
    for (const { name, tree } of wanted) {
      await context.breathe();
      columns.push(await guard(file, () => readColumn(group, name, tree, rows, slice, file)));
    }
    for (let row = 0; row < rows; row += BATCH_ROWS) {
      const part = Math.min(BATCH_ROWS, rows - row);
      for (const [at, { role }] of wanted.entries()) batch.columns[role].set(columns[at].subarray(row, row + part));
      for (let i = 0; i < part; i++) batch.row[i] = ledger.rowsPresent++;
      batch.line.fill(0, 0, part);
      batch.rows = part;
      pass.advance(Math.round((part / total) * source.size));
      yield;
      await context.breathe();
    }
  }
}

async function readColumn(
  group: FileMetaData['row_groups'][number],
  name: string,
  tree: SchemaTree,
  rows: number,
  slice: (start: number, end: number) => Promise<Uint8Array>,
  file: string,
): Promise<Float64Array> {
  const meta = group.columns.find((column) => column.meta_data?.path_in_schema[0] === name)?.meta_data;
  const type = tree.element.type;
  if (meta === undefined || type === undefined || !isParquetNumber(type) || meta.type !== type) {
    throw new Error(`a row group without numbers for ${name}`);
  }
  if (!CODECS.has(meta.codec)) {
    throw new WakeloomError(
      'dump/parquet-codec',
      `Parquet compression: got ${meta.codec}, expected none, snappy or zstd; write the file with one of these (${file})`,
      { file, codec: String(meta.codec) },
    );
  }
  const data = Number(meta.data_page_offset);
  const dictionary = Number(meta.dictionary_page_offset ?? data);
  // Some writers state an offset of 0 where there is no dictionary.
  const start = dictionary > 0 ? Math.min(dictionary, data) : data;
  const bytes = await slice(start, start + Number(meta.total_compressed_size));
  const values = new Float64Array(rows);
  const chunk: ParquetChunk = {
    type,
    unsigned: String(tree.element.converted_type ?? '').startsWith('UINT'),
    codec: meta.codec,
    optional: tree.element.repetition_type === 'OPTIONAL',
  };
  try {
    decodeParquetColumn(bytes, chunk, values);
  } catch (error) {
    if (!(error instanceof UnknownEncoding)) throw error;
    throw new WakeloomError(
      'dump/parquet-encoding',
      `Parquet encoding: got encoding ${error.encoding} of "${name}", expected plain, dictionary or byte stream split; write the file with version 1 data pages (${file})`,
      { file, column: name, encoding: error.encoding },
      error,
    );
  }
  return values;
}

function refuseGroups(metadata: FileMetaData, file: string): void {
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
  }
  if (sum !== Number(metadata.num_rows)) throw new Error(`${sum} rows in groups instead of ${metadata.num_rows}`);
}

function refuseColumn(name: string, tree: SchemaTree, file: string): void {
  const { type, converted_type: meaning, repetition_type: repetition } = tree.element;
  const flat = tree.children.length === 0 && repetition !== 'REPEATED';
  const numeric = type !== undefined && isParquetNumber(type) && (meaning === undefined || PLAIN_MEANING.test(meaning));
  if (flat && numeric) return;
  throw new WakeloomError(
    'dump/column-not-numeric',
    `column not numeric: got ${flat ? [type, meaning].filter((part) => part !== undefined).join(' ') : 'a nested value'} in "${name}", expected whole or real numbers (${file})`,
    { file, column: name },
  );
}

/** Damaged files make the library and the decoder throw plain errors: they get a code and the file's name. */
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
