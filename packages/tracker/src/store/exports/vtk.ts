import type { GridResult } from '../../eulerian/grid.js';
import { divisorFor, type Normalisation, type ResultUnits } from './normalise.js';
import type { PathlineSource } from './pathline-table.js';
import { type CountedSink, EXPORT_ROWS, type ExportSettings, type ExportTable, type ExportType } from './table.js';
import { interleaved, type VtkArray, vtkArrays } from './vtk-columns.js';
import { type VtkType, VtkXml } from './vtk-xml.js';

const TYPE: Readonly<Record<ExportType, VtkType>> = { i32: 'Int32', i64: 'Int64', f32: 'Float32', f64: 'Float64' };

async function writeArrays(xml: VtkXml, table: ExportTable, arrays: readonly VtkArray[], settings: ExportSettings) {
  for (let a = 0; a < arrays.length; a++) {
    const { name, parts } = arrays[a]!;
    const type = TYPE[table.columns[parts[0]!]!.type];
    await xml.array(name, type, parts.length, table.rows * parts.length, interleaved(table, parts, settings));
    settings.context?.progress('export', a + 1, arrays.length, 'arrays');
  }
}

async function* counting(count: number, from: number): AsyncGenerator<Float64Array> {
  for (let start = 0; start < count; start += EXPORT_ROWS) {
    const length = Math.min(EXPORT_ROWS, count - start);
    yield Float64Array.from({ length }, (_, i) => from + start + i);
  }
}

/** Ends of the lines in the connectivity: the running sum of samples a pathline. */
async function* lineEnds(rowSize: Int32Array): AsyncGenerator<Float64Array> {
  let end = 0;
  for (let start = 0; start < rowSize.length; start += EXPORT_ROWS) {
    const part = rowSize.subarray(start, start + EXPORT_ROWS);
    yield Float64Array.from(part, (size) => {
      end += size;
      return end;
    });
  }
}

async function* whole(values: ArrayLike<number>): AsyncGenerator<ArrayLike<number>> {
  yield values;
}

/**
 * Pathlines as VTK XML PolyData (.vtp): a point a sample, a polyline a pathline in the order of the file, its number
 * as cell data. Arrays are inline base64 with 64-bit counts. z is 0 in the plane. Reads each column once.
 */
export async function writeVtp(
  source: PathlineSource,
  table: ExportTable,
  sink: CountedSink,
  settings: ExportSettings,
): Promise<void> {
  const xml = new VtkXml(sink);
  const axes = ['x', 'y', 'z'].map((name) => table.columns.findIndex((column) => column.name === name));
  const points = axes.map((column) => (column < 0 ? null : column));
  const lines = source.number.length;
  await xml.head('PolyData');
  const counts = `NumberOfPoints="${table.rows}" NumberOfVerts="0" NumberOfLines="${lines}" NumberOfStrips="0" NumberOfPolys="0"`;
  await xml.text(`<PolyData>\n<Piece ${counts}>\n<PointData Vectors="velocity">\n`);
  await writeArrays(xml, table, vtkArrays(table, ['x', 'y', 'z', 'pathline']), settings);
  await xml.text('</PointData>\n<CellData>\n');
  await xml.array('pathline', 'Int32', 1, lines, whole(source.number));
  await xml.text('</CellData>\n<Points>\n');
  await xml.array('Points', 'Float64', 3, 3 * table.rows, interleaved(table, points, settings));
  await xml.text('</Points>\n<Lines>\n');
  await xml.array('connectivity', 'Int64', 1, table.rows, counting(table.rows, 0));
  await xml.array('offsets', 'Int64', 1, lines, lineEnds(source.rowSize));
  await xml.text('</Lines>\n</Piece>\n</PolyData>\n</VTKFile>\n');
}

/**
 * A grid as VTK XML ImageData (.vti): point data at the bin centres, x fastest, one layer in the plane. NaN where a
 * bin is empty.
 */
export async function writeVti(
  grid: GridResult,
  units: ResultUnits,
  normalise: Normalisation | null,
  table: ExportTable,
  sink: CountedSink,
  settings: ExportSettings,
): Promise<void> {
  const xml = new VtkXml(sink);
  const { dims, count, first, step } = grid.shape;
  const divisor = normalise === null ? 1 : divisorFor(units.length, units, normalise);
  const extent = count.map((size) => `0 ${size - 1}`).join(' ');
  const place = (values: readonly number[], flat: number) =>
    values.map((value, axis) => (axis < dims ? value / divisor : flat)).join(' ');
  await xml.head('ImageData');
  // A spacing of 0 along the missing axis confuses readers; its size is never used.
  const frame = `WholeExtent="${extent}" Origin="${place(first, 0)}" Spacing="${place(step, 1)}"`;
  await xml.text(`<ImageData ${frame}>\n<Piece Extent="${extent}">\n<PointData Vectors="velocity">\n`);
  await writeArrays(xml, table, vtkArrays(table, ['x', 'y', 'z']), settings);
  await xml.text('</PointData>\n<CellData>\n</CellData>\n</Piece>\n</ImageData>\n</VTKFile>\n');
}
