import type { NumericArray } from '../../core/hdf5.js';
import type { GridResult } from '../../eulerian/grid.js';
import { divisorFor, type Normalisation, type ResultUnits } from './normalise.js';
import type { ExportColumn, ExportTable } from './table.js';

const VELOCITY = ['u', 'v', 'w'];
const VELOCITY_SE = ['u_se', 'v_se', 'w_se'];
const STRESSES = ['uu', 'uv', 'vv', 'uw', 'vw', 'ww'];

/** Fields in the order users rely on: means, their standard errors, stresses, then the others as the grid has them. */
export function fieldOrder(grid: GridResult): readonly string[] {
  const known = [...VELOCITY, ...VELOCITY_SE, ...STRESSES].filter((name) => grid.fields.has(name));
  return [...known, ...[...grid.fields.keys()].filter((name) => !known.includes(name))];
}

/** Coordinate of bin `row` along an axis; x runs fastest. */
function coordinate(grid: GridResult, axis: number, row: number): number {
  const { count, first, step } = grid.shape;
  const along =
    axis === 0
      ? row % count[0]
      : axis === 1
        ? Math.floor(row / count[0]) % count[1]
        : Math.floor(row / (count[0] * count[1]));
  return first[axis]! + along * step[axis]!;
}

/** Bins as a table, one row a bin, x fastest. Borrows the grid. */
export function gridTable(grid: GridResult, units: ResultUnits, normalise: Normalisation | null): ExportTable {
  const { dims, count } = grid.shape;
  const axes = ['x', 'y', 'z'].slice(0, dims);
  const fields = fieldOrder(grid);
  const rows = count[0] * count[1] * count[2];
  const column = (name: string, type: ExportColumn['type'], unit: string): ExportColumn => ({
    name,
    type,
    unit,
    present: true,
  });
  const columns = [
    ...axes.map((axis) => column(axis, 'f64', units.length)),
    column('samples', 'i32', '1'),
    column('pathlines', 'i32', '1'),
    ...fields.map((name) => column(name, 'f32', grid.fields.get(name)!.unit)),
  ];
  const divisors = columns.map((one) => (normalise === null ? 1 : divisorFor(one.unit, units, normalise)));
  return {
    columns: normalise === null ? columns : columns.map((one) => ({ ...one, unit: '1' })),
    shape: [...count.slice(0, dims)].reverse(),
    rows,
    read(index, start, end): NumericArray {
      const divisor = divisors[index]!;
      if (index < dims)
        return Float64Array.from({ length: end - start }, (_, i) => coordinate(grid, index, start + i) / divisor);
      const { name } = columns[index]!;
      const counts = name === 'samples' ? grid.samples : name === 'pathlines' ? grid.pathlines : null;
      if (counts !== null) return Int32Array.from(counts.subarray(start, end));
      const { values } = grid.fields.get(name)!;
      return divisor === 1 ? values.subarray(start, end) : values.subarray(start, end).map((value) => value / divisor);
    },
  };
}
