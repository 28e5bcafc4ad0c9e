import { EXPORT_ROWS, type ExportSettings, type ExportTable } from './table.js';

/** A data array of a VTK file and the columns it is made of; missing components are filled with zeros. */
export interface VtkArray {
  readonly name: string;
  /** Columns by index in the table; null: zero. */
  readonly parts: readonly (number | null)[];
}

const VECTORS: readonly (readonly [string, readonly string[]])[] = [
  ['velocity', ['u', 'v', 'w']],
  ['acceleration', ['ax', 'ay', 'az']],
  ['velocity_se', ['u_se', 'v_se', 'w_se']],
];

/** Columns as VTK arrays: velocity and acceleration as vectors of three, the rest as scalars; absent ones left out. */
export function vtkArrays(table: ExportTable, leaveOut: readonly string[]): readonly VtkArray[] {
  const index = (name: string) => table.columns.findIndex((column) => column.name === name && column.present);
  const arrays: VtkArray[] = [];
  const used = new Set(leaveOut);
  for (const [name, parts] of VECTORS) {
    const found = parts.map(index);
    if (found[0]! < 0 || found[1]! < 0) continue;
    arrays.push({ name, parts: found.map((column) => (column < 0 ? null : column)) });
    for (const part of parts) used.add(part);
  }
  table.columns.forEach((column, i) => {
    if (column.present && !used.has(column.name)) arrays.push({ name: column.name, parts: [i] });
  });
  return arrays;
}

/** Columns interleaved as VTK wants the components of a vector, piece by piece. */
export async function* interleaved(
  table: ExportTable,
  parts: readonly (number | null)[],
  settings: ExportSettings,
): AsyncGenerator<Float64Array> {
  const step = settings.rows ?? EXPORT_ROWS;
  for (let start = 0; start < table.rows; start += step) {
    const end = Math.min(table.rows, start + step);
    const out = new Float64Array((end - start) * parts.length);
    for (let p = 0; p < parts.length; p++) {
      const column = parts[p];
      if (column === null || column === undefined) continue;
      const values = await table.read(column, start, end);
      for (let i = 0; i < end - start; i++) out[i * parts.length + p] = values[i]!;
    }
    yield out;
    await settings.context?.breathe();
  }
}
