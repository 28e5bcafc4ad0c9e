import type { ByteSink } from '../../core/bytes.js';
import { WakeloomError } from '../../core/errors.js';
import type { GridResult } from '../../eulerian/grid.js';
import { writeCsv } from './csv.js';
import { gridTable } from './grid-table.js';
import { type Normalisation, normalisedRemark, type ResultUnits } from './normalise.js';
import { writeNpy } from './npy.js';
import { writeParquet } from './parquet.js';
import { type PathlineSource, pathlineTable } from './pathline-table.js';
import { type CountedSink, counted, type ExportSettings, type ExportSummary, type ExportTable } from './table.js';
import { writeVti, writeVtp } from './vtk.js';

/** Options of an export. */
export interface ExportOptions extends ExportSettings {
  /** Divide everything by a length and a speed, both in the units of the results. */
  readonly normalise?: Normalisation;
}

interface GridInput {
  readonly grid: GridResult;
  readonly units: ResultUnits;
  readonly normalise: Normalisation | null;
}

/** One format. */
export interface Exporter {
  readonly format: string;
  /** File name endings with the dot. */
  readonly extension: { readonly pathlines: string; readonly grid: string };
  /** One line for help. */
  readonly help: string;
  pathlines(source: PathlineSource, table: ExportTable, sink: CountedSink, settings: ExportSettings): Promise<void>;
  grid(input: GridInput, table: ExportTable, sink: CountedSink, settings: ExportSettings): Promise<void>;
}

function tabular(format: string, help: string, write: typeof writeCsv): Exporter {
  return {
    format,
    extension: { pathlines: `.${format}`, grid: `.${format}` },
    help,
    pathlines: (_source, table, sink, settings) => write(table, sink, settings),
    grid: (_input, table, sink, settings) => write(table, sink, settings),
  };
}

/** Every format a result is exported to. */
export const EXPORTERS: readonly Exporter[] = [
  tabular('csv', 'text, comma-separated, one header line', writeCsv),
  tabular('parquet', 'Apache Parquet', writeParquet),
  tabular('npy', 'NumPy file with one named field a column', writeNpy),
  {
    format: 'vtk',
    extension: { pathlines: '.vtp', grid: '.vti' },
    help: 'VTK XML: polylines (.vtp) or image data (.vti)',
    pathlines: writeVtp,
    grid: ({ grid, units, normalise }, table, sink, settings) =>
      writeVti(grid, units, normalise, table, sink, settings),
  },
];

/** The exporter of a format; code `usage/export-format` where there is none. */
export function findExporter(format: string): Exporter {
  const found = EXPORTERS.find((exporter) => exporter.format === format.toLowerCase());
  if (found !== undefined) return found;
  const known = EXPORTERS.map((exporter) => exporter.format).join(', ');
  throw new WakeloomError('usage/export-format', `export format: got "${format}", expected one of ${known}`, {
    format,
  });
}

function remarksOf(table: ExportTable, units: ResultUnits, normalise: Normalisation | null): readonly string[] {
  const remarks: string[] = [];
  const missing = table.columns.filter((column) => !column.present).map((column) => column.name);
  if (missing.length > 0) {
    remarks.push(
      `The result has no ${missing.join(', ')} (image pairs give no acceleration): empty in CSV, NaN in Parquet and NPY, left out in VTK.`,
    );
  }
  if (normalise !== null) remarks.push(normalisedRemark(normalise, units));
  return remarks;
}

/**
 * Writes samples in pathline order: `pathline, frame, detection, t, x, y(, z), u, v(, w), ax, ay(, az), u_se, v_se
 * (, w_se), flags`, then further columns. `flags` is the sum of the masks in `FLAG`. The sink is written to and not
 * closed. Memory: one piece of rows, 20 bytes a pathline. Codes: `usage/export-format`, `usage/normalise`.
 */
export async function exportPathlines(
  source: PathlineSource,
  format: string,
  sink: ByteSink,
  options: ExportOptions = {},
): Promise<ExportSummary> {
  const exporter = findExporter(format);
  const normalise = options.normalise ?? null;
  const table = pathlineTable(source, normalise);
  const out = counted(sink);
  await exporter.pathlines(source, table, out, options);
  return summary(table, out.bytes, remarksOf(table, source.units, normalise));
}

/**
 * Writes bins, x fastest: `x, y(, z), samples, pathlines, u, v(, w), u_se, v_se(, w_se), uu, uv, vv, ...`. A bin too
 * thin for a figure is an empty cell in CSV and NaN elsewhere. The sink is written to and not closed. Codes as above.
 */
export async function exportGrid(
  grid: GridResult,
  units: ResultUnits,
  format: string,
  sink: ByteSink,
  options: ExportOptions = {},
): Promise<ExportSummary> {
  const exporter = findExporter(format);
  const normalise = options.normalise ?? null;
  const table = gridTable(grid, units, normalise);
  const out = counted(sink);
  await exporter.grid({ grid, units, normalise }, table, out, options);
  return summary(table, out.bytes, remarksOf(table, units, normalise));
}

function summary(table: ExportTable, bytes: number, remarks: readonly string[]): ExportSummary {
  return { rows: table.rows, columns: table.columns.map((column) => column.name), bytes, remarks };
}
