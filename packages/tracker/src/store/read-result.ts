import type { Dims } from '../core/columns.js';
import { WakeloomError } from '../core/errors.js';
import type { Hdf5Reader, NumericArray } from '../core/hdf5.js';
import type { ResultPlace } from '../core/result-place.js';
import type { GridResult } from '../eulerian/grid.js';
import type { ResultUnits } from './file-attributes.js';
import { SIZE_ONLY } from './netcdf-names.js';
import { readGrid } from './read-grid.js';
import { placeFiles, type ResultFiles, readRunRecord } from './result-files.js';
import type { RunRecord } from './run-record.js';

export { isCompleteResult } from './result-files.js';

/** pathlines.nc open for reading; fits what the exporters take. Arrays are new unless said otherwise. */
export interface PathlinesReader {
  readonly dims: Dims;
  readonly units: ResultUnits;
  readonly samples: number;
  /** Number of each pathline, its samples, first and last frame. [pathlines] */
  readonly number: Int32Array;
  readonly rowSize: Int32Array;
  readonly firstFrame: Int32Array;
  readonly lastFrame: Int32Array;
  /** First row of each pathline, and the number of rows. [pathlines + 1] */
  readonly firstRow: Float64Array;
  /** Names of the sample variables: `frame`, `time`, `x`, `u`, `u_se`, ... */
  readonly variables: readonly string[];
  /** Rows start .. end - 1 of a sample variable. Code `store/no-such-variable`. */
  rows(variable: string, start: number, end: number): NumericArray;
  /** All variables of the pathline at `index` (its place in `number`). Code `store/no-such-pathline`. */
  pathline(index: number): Readonly<Record<string, NumericArray>>;
}

/** Samples of one instant; columns by name: x, y, (z), u, v, (w), flags, pathline_index, pathlines_row. */
export interface Instant {
  readonly frame: number;
  readonly time: number;
  readonly columns: Readonly<Record<string, NumericArray>>;
}

/** frames.nc open for reading. */
export interface FramesReader {
  /** Frame numbers, times, first rows and row counts. [frames] */
  readonly number: Int32Array;
  readonly time: Float64Array;
  readonly firstRow: Float64Array;
  readonly rowSize: Int32Array;
  readonly samples: number;
  /** Samples of the frame at `index` (its place in `number`). Code `store/no-such-frame`. */
  instant(index: number): Instant;
  /** The thinned overview; columns as an instant's, with `pathline` and `frame`. */
  overview(): Readonly<Record<string, NumericArray>>;
}

/** A finished result open for reading. What the run did not keep is null. */
export interface ResultReader {
  readonly record: RunRecord;
  readonly pathlines: PathlinesReader | null;
  readonly frames: FramesReader | null;
  grid(): GridResult | null;
  close(): void;
}

/**
 * Opens a result folder. Reads run.json and the per-pathline and per-frame tables (28 bytes a pathline, 24 a frame).
 * Takes schema versions up to its own within the major. Codes: `store/not-a-result`, `store/newer-schema`,
 * `store/older-schema`.
 */
export async function openResult(from: ResultPlace | ResultFiles): Promise<ResultReader> {
  const files = 'hdf5Path' in from ? placeFiles(from) : from;
  const record = await readRunRecord(files);
  const opened = new Map<string, Hdf5Reader>();
  const close = () => {
    for (const file of opened.values()) file.close();
    opened.clear();
  };
  try {
    for (const file of Object.keys(record.digest.files)) opened.set(file, await files.hdf5(file));
    const pathlines = opened.get('pathlines.nc');
    const frames = opened.get('frames.nc');
    const grid = opened.get('grid.nc');
    const units = { length: record.figures.lengthUnit, time: record.figures.timeUnit };
    return {
      record,
      pathlines: pathlines === undefined ? null : pathlinesReader(pathlines, units, files.name),
      frames: frames === undefined ? null : framesReader(frames, files.name),
      grid: () => (grid === undefined ? null : readGrid(grid, files.name)),
      close,
    };
  } catch (error) {
    close();
    throw error;
  }
}

/** All rows of a variable. Code `store/no-such-variable`. */
export function wholeVariable(file: Hdf5Reader, name: string, where: string): NumericArray {
  const dataset = file.dataset(`/${name}`);
  if (dataset === null) {
    const message = `result file: got no variable ${name}, expected it (${where}); the file is not what run.json says, process the run again`;
    throw new WakeloomError('store/no-such-variable', message, { variable: name, path: where });
  }
  return dataset.rows(0, dataset.shape[0]);
}

/** Names of the variables of the given first dimension size that are no dimension without values. */
function variablesOf(file: Hdf5Reader): string[] {
  return file
    .datasets()
    .map((path) => path.slice(1))
    .filter((name) => !String(file.dataset(`/${name}`)?.attribute('NAME') ?? '').startsWith(SIZE_ONLY));
}

/** Names that pathlines.nc has beside the sample variables. */
const PER_PATHLINE = new Set(['pathline', 'row_size', 'first_frame', 'last_frame']);

function outOfRange(
  code: 'store/no-such-pathline' | 'store/no-such-frame',
  index: number,
  count: number,
  where: string,
) {
  const what = code === 'store/no-such-frame' ? 'frame' : 'pathline';
  const message = `${what}: got index ${index}, expected 0 to ${count - 1} (${where})`;
  return new WakeloomError(code, message, { index, count, path: where });
}

function pathlinesReader(file: Hdf5Reader, units: ResultUnits, where: string): PathlinesReader {
  const perPathline = (name: string) => wholeVariable(file, name, where) as Int32Array;
  const number = perPathline('pathline');
  const rowSize = perPathline('row_size');
  const firstRow = new Float64Array(number.length + 1);
  for (let p = 0; p < number.length; p++) firstRow[p + 1] = firstRow[p] + rowSize[p];
  const variables = variablesOf(file).filter((name) => !PER_PATHLINE.has(name));
  const rows = (variable: string, start: number, end: number) => {
    const dataset = variables.includes(variable) ? file.dataset(`/${variable}`) : null;
    if (dataset === null) {
      const message = `pathlines: got variable ${variable}, expected one of ${variables.join(', ')} (${where})`;
      throw new WakeloomError('store/no-such-variable', message, { variable, path: where });
    }
    return dataset.rows(start, end);
  };
  return {
    dims: variables.includes('z') ? 3 : 2,
    units,
    samples: firstRow[number.length],
    number,
    rowSize,
    firstFrame: perPathline('first_frame'),
    lastFrame: perPathline('last_frame'),
    firstRow,
    variables,
    rows,
    pathline(index) {
      if (!(index >= 0 && index < number.length)) {
        throw outOfRange('store/no-such-pathline', index, number.length, where);
      }
      const entry = (name: string) => [name, rows(name, firstRow[index], firstRow[index + 1])] as const;
      return Object.fromEntries(variables.map(entry));
    },
  };
}

function framesReader(file: Hdf5Reader, where: string): FramesReader {
  const number = wholeVariable(file, 'frame', where) as Int32Array;
  const time = wholeVariable(file, 'time', where) as Float64Array;
  const firstRow = wholeVariable(file, 'first_row', where) as Float64Array;
  const rowSize = wholeVariable(file, 'row_size', where) as Int32Array;
  const all = variablesOf(file);
  const few = all.filter((name) => name.startsWith('overview_'));
  // The time of an instant is one; its copy in each sample is for other software.
  const own = new Set(['frame', 'time', 'first_row', 'row_size', 'pathline', 'sample_time']);
  const columns = all.filter((name) => !own.has(name) && !few.includes(name));
  const last = number.length - 1;
  return {
    number,
    time,
    firstRow,
    rowSize,
    samples: last < 0 ? 0 : firstRow[last] + rowSize[last],
    instant(index) {
      if (!(index >= 0 && index <= last)) throw outOfRange('store/no-such-frame', index, number.length, where);
      const [start, end] = [firstRow[index], firstRow[index] + rowSize[index]];
      const entry = (name: string) => {
        const dataset = file.dataset(`/${name}`);
        return [name, dataset === null ? new Float32Array(0) : dataset.rows(start, end)] as const;
      };
      return { frame: number[index], time: time[index], columns: Object.fromEntries(columns.map(entry)) };
    },
    overview: () =>
      Object.fromEntries(
        few.map((name) => [name.slice('overview_'.length), wholeVariable(file, name, where)] as const),
      ),
  };
}
