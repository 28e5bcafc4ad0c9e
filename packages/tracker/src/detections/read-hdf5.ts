import type { ByteSource } from '../core/bytes.js';
import { isWakeloomError, WakeloomError } from '../core/errors.js';
import type { Hdf5Dataset, Hdf5Reader, NumericArray } from '../core/hdf5.js';
import { planColumns } from './column-plan.js';
import type { DumpPass } from './dump-pass.js';
import { BATCH_ROWS } from './row-batch.js';

/** Columns found in an HDF5 file: datasets of equal length, or one dataset with rows and columns. */
interface Hdf5Columns {
  readonly names: readonly string[] | null;
  readonly count: number;
  readonly datasets: readonly Hdf5Dataset[];
}

/**
 * Reads an HDF5 file: one-dimensional datasets of equal length, a compound table, or one two-dimensional dataset
 * (rows, columns), below the path that the settings name, else anywhere in the file. Names are the last part of a
 * path. Yields whenever `pass.batch` holds rows. Memory: one batch of each column.
 *
 * Throws `dump/no-hdf5-reader`, `dump/no-such-dataset`, `dump/datasets-unclear`, `dump/columns-differ-in-length`,
 * `dump/corrupt-hdf5`, and what the opener throws (`dump/not-hdf5`).
 */
export async function* readHdf5(source: ByteSource, pass: DumpPass): AsyncGenerator<void> {
  const file = source.name;
  const opener = pass.tools.hdf5;
  if (opener === null) {
    throw new WakeloomError(
      'dump/no-hdf5-reader',
      `HDF5 dump: got no HDF5 reader here, expected one handed in; convert the dump to text, NPY or Parquet (${file})`,
      { file },
    );
  }
  const reader = await guard(file, () => opener.open(source));
  try {
    const found = await guard(file, async () => findColumns(reader, pass.settings.dataset, file));
    const first = found.datasets[0];
    const plan = planColumns(
      {
        file,
        names: found.names,
        count: found.count,
        firstIsWhole: found.names === null && (await guard(file, async () => firstColumnIsWhole(first, found.count))),
        needsFrame: pass.settings.layout === 'one-file-a-run',
        timesAreClock: pass.settings.timesAreClock,
      },
      pass.settings.columns,
    );
    pass.agreeColumns(file, plan);
    const wanted = [...plan.index].flatMap((at, role) => (at < 0 ? [] : [{ role, at }]));
    const { batch, ledger } = pass;
    const total = found.names === null ? first.shape[0] : equalLength(found, wanted, file);
    for (let row = 0; row < total; row += BATCH_ROWS) {
      const rows = Math.min(BATCH_ROWS, total - row);
      if (found.names === null) {
        const table = await guard(file, async () => whole(first.rows(row, row + rows), rows * found.count));
        for (const { role, at } of wanted) {
          const column = batch.columns[role];
          for (let i = 0, j = at; i < rows; i++, j += found.count) column[i] = table[j];
        }
      } else {
        for (const { role, at } of wanted) {
          const values = await guard(file, async () => whole(found.datasets[at].rows(row, row + rows), rows));
          batch.columns[role].set(values);
        }
      }
      for (let i = 0; i < rows; i++) batch.row[i] = ledger.rowsPresent++;
      batch.line.fill(0, 0, rows);
      batch.rows = rows;
      pass.advance(Math.round((rows / total) * source.size));
      yield;
      await pass.context.breathe();
    }
  } finally {
    reader.close();
  }
}

function findColumns(reader: Hdf5Reader, setting: string | null, file: string): Hdf5Columns {
  const root = setting === null ? '/' : `/${setting.replace(/^\/+|\/+$/g, '')}`;
  const all = reader.datasets();
  const below = all.filter(
    (path) => root === '/' || path === root || path.startsWith(`${root}/`) || path.startsWith(`${root}:`),
  );
  if (below.length === 0) {
    throw new WakeloomError(
      'dump/no-such-dataset',
      `no numbers in the HDF5 file: got nothing at ${root}, expected ${all.length === 0 ? 'numeric datasets' : `one of ${all.slice(0, 12).join(', ')}`} (${file})`,
      { file, path: root, datasets: all.slice(0, 50) },
    );
  }
  const datasets = below.flatMap((path) => reader.dataset(path) ?? []);
  const lines = datasets.filter(({ shape }) => shape.length === 1);
  const tables = datasets.filter(({ shape }) => shape.length === 2);
  if (lines.length >= 2 || (lines.length > 0 && tables.length === 0)) {
    return { names: lines.map(({ path }) => lastPart(path)), count: lines.length, datasets: lines };
  }
  if (tables.length === 1) return { names: null, count: tables[0].shape[1], datasets: tables };
  throw new WakeloomError(
    'dump/datasets-unclear',
    `datasets not clear: got ${datasets.map(({ path, shape }) => `${path} (${shape.join(' x ')})`).join(', ')}, expected columns of one dimension or one table of two; name it with dump: { dataset: PATH } (${file})`,
    { file, datasets: below.slice(0, 50) },
  );
}

function equalLength(found: Hdf5Columns, wanted: readonly { at: number }[], file: string): number {
  const length = found.datasets[wanted[0].at].shape[0];
  const odd = wanted.find(({ at }) => found.datasets[at].shape[0] !== length);
  if (odd === undefined) return length;
  const [a, b] = [found.datasets[wanted[0].at], found.datasets[odd.at]];
  throw new WakeloomError(
    'dump/columns-differ-in-length',
    `columns of different length: got ${a.shape[0]} values in ${a.path} and ${b.shape[0]} in ${b.path}, expected as many in each (${file})`,
    { file },
  );
}

function firstColumnIsWhole(table: Hdf5Dataset, count: number): boolean {
  const rows = Math.min(400, table.shape[0]);
  const values = whole(table.rows(0, rows), rows * count);
  for (let i = 0; i < values.length; i += count) {
    if (Number.isFinite(values[i]) && !Number.isInteger(values[i])) return false;
  }
  return true;
}

function whole(values: NumericArray, expected: number): NumericArray {
  if (values.length === expected) return values;
  throw new Error(`${values.length} values instead of ${expected}`);
}

function lastPart(path: string): string {
  return path.replace(/^.*[/:]/, '');
}

/** The HDF5 library throws plain errors on damaged files: they get a code and the file's name. */
async function guard<T>(file: string, call: () => Promise<T>): Promise<T> {
  try {
    return await call();
  } catch (error) {
    if (isWakeloomError(error)) throw error;
    const what = error instanceof Error ? error.message : String(error);
    throw new WakeloomError(
      'dump/corrupt-hdf5',
      `HDF5 file corrupt: got "${what}", expected readable datasets; copy the file again (${file})`,
      { file },
      error,
    );
  }
}
