import type { Dims } from '../../core/columns.js';
import { WakeloomError } from '../../core/errors.js';
import type { NumericArray } from '../../core/hdf5.js';
import { divisorFor, type Normalisation, type ResultUnits } from './normalise.js';
import type { ExportColumn, ExportTable, ExportType } from './table.js';

/** Samples in pathline order, as pathlines.nc holds them; what an exporter needs of a result folder. */
export interface PathlineSource {
  readonly dims: Dims;
  readonly units: ResultUnits;
  /** Samples in all. */
  readonly samples: number;
  /** Number of each pathline and its samples, in file order. [pathlines] */
  readonly number: Int32Array;
  readonly rowSize: Int32Array;
  /** Names of the sample variables that are there: `frame`, `time`, `x`, `u`, `u_se`, ... */
  readonly variables: readonly string[];
  /** Rows start .. end - 1 of a sample variable, valid until the next call. */
  rows(variable: string, start: number, end: number): NumericArray | Promise<NumericArray>;
}

type Wanted = readonly [
  name: string,
  variable: string,
  type: ExportType,
  unit: 'length' | 'time' | 'velocity' | 'acceleration' | null,
];

/** Columns in the order users rely on: those up to `flags` never change, later ones are only added at the end. */
function wantedColumns(dims: Dims): readonly Wanted[] {
  const pick = <T>(names: readonly T[]) => names.slice(0, dims);
  const same = (names: readonly string[], type: ExportType, unit: Wanted[3]) =>
    pick(names).map((name): Wanted => [name, name, type, unit]);
  return [
    ['pathline', 'pathline', 'i32', null],
    ['frame', 'frame', 'i32', null],
    ['detection', 'detection', 'i64', null],
    ['t', 'time', 'f64', 'time'],
    ...same(['x', 'y', 'z'], 'f64', 'length'),
    ...same(['u', 'v', 'w'], 'f32', 'velocity'),
    ...same(['ax', 'ay', 'az'], 'f32', 'acceleration'),
    ...same(['u_se', 'v_se', 'w_se'], 'f32', 'velocity'),
    ['flags', 'flags', 'i32', null],
    ...same(['x_se', 'y_se', 'z_se'], 'f32', 'length'),
    ...same(['ax_se', 'ay_se', 'az_se'], 'f32', 'acceleration'),
    ...same(['measured_x', 'measured_y', 'measured_z'], 'f64', 'length'),
    ['link_risk', 'link_risk', 'f32', null],
  ];
}

function unitText(kind: Wanted[3], units: ResultUnits): string {
  if (kind === 'length') return units.length;
  if (kind === 'time') return units.time;
  if (kind === 'velocity') return `${units.length}/${units.time}`;
  if (kind === 'acceleration') return `${units.length}/${units.time}2`;
  return '1';
}

/** Fills `into` with the pathline number of rows start .. end - 1; `first` is the row offset of each pathline. */
export function pathlineOfRowsInto(
  source: PathlineSource,
  first: Float64Array,
  start: number,
  end: number,
  into: Int32Array,
): void {
  let low = 0;
  let high = source.number.length;
  while (high - low > 1) {
    const middle = (low + high) >> 1;
    if (first[middle]! <= start) low = middle;
    else high = middle;
  }
  let pathline = low;
  for (let row = start; row < end; row++) {
    while (row >= first[pathline + 1]!) pathline++;
    into[row - start] = source.number[pathline]!;
  }
}

/** Row offsets of the pathlines, [pathlines + 1]. */
export function rowOffsets(source: PathlineSource): Float64Array {
  const first = new Float64Array(source.number.length + 1);
  for (let p = 0; p < source.number.length; p++) first[p + 1] = first[p]! + source.rowSize[p]!;
  return first;
}

/** Only what image pairs or older results may lack is optional. */
function checkVariables(source: PathlineSource): void {
  const needed = ['frame', 'time', 'detection', 'flags', ...['x', 'y', 'z'].slice(0, source.dims)];
  const missing = needed.filter((name) => !source.variables.includes(name));
  if (missing.length === 0) return;
  throw new WakeloomError(
    'store/variable-missing',
    `pathlines: got no variable ${missing.join(', ')}, expected it in pathlines.nc; process the run again`,
    { missing },
  );
}

/** Samples as a table of columns. Memory: 8 bytes a pathline and one piece of one column. Code `store/variable-missing`. */
export function pathlineTable(source: PathlineSource, normalise: Normalisation | null): ExportTable {
  checkVariables(source);
  const wanted = wantedColumns(source.dims);
  const first = rowOffsets(source);
  const columns = wanted.map(
    ([name, variable, type, unit]): ExportColumn => ({
      name,
      type,
      unit: normalise === null ? unitText(unit, source.units) : '1',
      present: variable === 'pathline' || source.variables.includes(variable),
    }),
  );
  const divisors = wanted.map(([, , , unit]) =>
    normalise === null || unit === null ? 1 : divisorFor(unitText(unit, source.units), source.units, normalise),
  );
  return {
    columns,
    shape: [source.samples],
    rows: source.samples,
    async read(column, start, end) {
      const [, variable, type] = wanted[column]!;
      if (variable === 'pathline') {
        const numbers = new Int32Array(end - start);
        pathlineOfRowsInto(source, first, start, end, numbers);
        return numbers;
      }
      if (!columns[column]!.present) return new Float32Array(end - start).fill(Number.NaN);
      const values = await source.rows(variable, start, end);
      const divisor = divisors[column]!;
      if (divisor === 1) return values;
      const scaled = type === 'f32' ? new Float32Array(values.length) : new Float64Array(values.length);
      for (let i = 0; i < values.length; i++) scaled[i] = values[i]! / divisor;
      return scaled;
    },
  };
}
