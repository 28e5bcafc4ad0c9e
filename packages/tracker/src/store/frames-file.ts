import { FLAG } from '../core/columns.js';
import type { RunContext } from '../core/context.js';
import type { ResultPlace } from '../core/result-place.js';
import { columnAttributes, fileAttributes, type ResultUnits, THINNING, thinningAttributes } from './file-attributes.js';
import { createNetcdf, type NetcdfWriter } from './netcdf-writer.js';
import type { Numbering } from './numbering.js';
import { type Kept, LEFT_OUT } from './pathlines-file.js';
import type { SampleColumn } from './sample-columns.js';
import { type Column, columnOf, type Spilled } from './spill.js';

/** Columns of a sample that frames.nc shows, besides the pathline and its row in pathlines.nc. */
export const FRAME_KEYS = ['x', 'y', 'z', 'u', 'v', 'w', 'flags'] as const;

/** Samples in the overview, at most about (the choice is by row number, see `inOverview`). A screenful; our choice. */
const OVERVIEW_SAMPLES = 1 << 16;

/** Rows gathered before they are written: a whole number of chunks. */
const OUT_ROWS = 1 << 16;

/** What frames.nc is made from. `kept` is null when there is no pathlines.nc. */
export interface FramesInput {
  readonly spilled: Spilled;
  readonly numbering: Numbering;
  readonly kept: Kept | null;
  /** 1 for each stuck pathline. [pathlines] */
  readonly stuck: Uint8Array;
  readonly columns: readonly SampleColumn[];
  readonly keep: 'all' | 'thinned';
  readonly units: ResultUnits;
  readonly title: string;
}

/**
 * Whether row `row` of `rows` stands in the overview: multiples of the golden ratio modulo 1 (Weyl sequence, 32 bit)
 * spread evenly over every frame, whatever the order of particles within frames.
 */
export function inOverview(row: number, rows: number): boolean {
  return rows <= OVERVIEW_SAMPLES || Math.imul(row, 0x9e3779b1) >>> 0 < (OVERVIEW_SAMPLES / rows) * 4294967296;
}

/**
 * Writes frames.nc from the spill: CF indexed ragged array, `first_row` and `row_size` by frame. Walks the spill
 * twice (the first time the pathline numbers only). Resolves to the content digest.
 */
export async function writeFramesFile(place: ResultPlace, input: FramesInput, context: RunContext): Promise<string> {
  const { spilled, numbering, columns, keep } = input;
  const sizes = await keptPerFrame(input, context);
  const frameCount = sizes.length;
  const shown = (frame: number) => keep === 'all' || frame % THINNING === 0;
  const indices: number[] = [];
  let samples = 0;
  for (let frame = 0; frame < frameCount; frame++) {
    if (!shown(frame)) continue;
    indices.push(frame);
    samples += sizes[frame];
  }
  let overview = 0;
  for (let row = 0; row < samples; row++) if (inOverview(row, samples)) overview++;
  const file = createNetcdf(place, 'frames.nc', fileAttributes(input.title, 'trajectory', thinningAttributes(keep)));
  try {
    declare(file, input, indices.length, samples, overview);
    file.append(
      'frame',
      Int32Array.from(indices, (frame) => spilled.frameNumber.array[frame]),
    );
    file.append(
      'time',
      Float64Array.from(indices, (frame) => spilled.frameTime.array[frame]),
    );
    file.append(
      'row_size',
      Int32Array.from(indices, (frame) => sizes[frame]),
    );
    let first = 0;
    const firstRows = Float64Array.from(indices, (frame) => {
      first += sizes[frame];
      return first - sizes[frame];
    });
    file.append('first_row', firstRows);
    file.append(
      'pathline',
      Int32Array.from({ length: numbering.pathlines }, (_, number) => number),
    );
    await writeSamples(file, input, samples, overview, columns, shown, context);
    return await file.finish(context);
  } catch (error) {
    file.abandon();
    throw error;
  }
}

/** Samples of kept pathlines in each frame. */
async function keptPerFrame({ spilled, numbering }: FramesInput, context: RunContext): Promise<Int32Array> {
  const sizes = new Int32Array(spilled.frameRows.length);
  for await (const { pathline, frames } of walkBatches(spilled, [], context)) {
    for (const { frame, first, end } of frames) {
      let count = 0;
      for (let i = first; i < end; i++) if (numbering.final[pathline[i]] >= 0) count++;
      sizes[frame] += count;
    }
  }
  return sizes;
}

interface FrameBatch {
  readonly pathline: Int32Array;
  readonly values: readonly Column[];
  /** Rows of this batch by frame index. */
  readonly frames: readonly { readonly frame: number; readonly first: number; readonly end: number }[];
}

/** The frame spill batch by batch; columns of `wanted` in that order (all of the spill's, or none). */
async function* walkBatches(
  spilled: Spilled,
  wanted: readonly SampleColumn[],
  context: RunContext,
  bytesARow = 0,
): AsyncGenerator<FrameBatch> {
  const { frames, batches, frameRows } = spilled;
  if (frames === null) return;
  let position = 0;
  let frame = 0;
  let left = frameRows.length > 0 ? frameRows.array[0] : 0;
  const rowSize = bytesARow > 0 ? bytesARow : frames.length / batches.reduce((sum, batch) => sum + batch.rows, 0);
  for (const batch of batches) {
    const pathline = new Int32Array(batch.rows);
    frames.read(position, new Uint8Array(pathline.buffer));
    let at = position + 4 * batch.rows;
    const values = wanted.map((column) => {
      const out = columnOf(column.stored, batch.rows);
      frames.read(at, new Uint8Array(out.buffer));
      at += out.byteLength;
      return out;
    });
    const ranges: { frame: number; first: number; end: number }[] = [];
    for (let row = 0; row < batch.rows; ) {
      while (left === 0) left = frameRows.array[++frame];
      const end = Math.min(batch.rows, row + left);
      ranges.push({ frame, first: row, end });
      left -= end - row;
      row = end;
    }
    yield { pathline, values, frames: ranges };
    position += rowSize * batch.rows;
    await context.breathe();
  }
}

async function writeSamples(
  file: NetcdfWriter,
  input: FramesInput,
  samples: number,
  overview: number,
  columns: readonly SampleColumn[],
  shown: (frame: number) => boolean,
  context: RunContext,
): Promise<void> {
  const { spilled, numbering, kept, stuck } = input;
  const { final, next } = numbering;
  const out = columns.map((column) => columnOf(column.stored, OUT_ROWS));
  const outPathline = new Int32Array(OUT_ROWS);
  const outRow = new Int32Array(OUT_ROWS);
  const few = columns.map((column) => columnOf(column.stored, overview));
  const fewPathline = new Int32Array(overview);
  const fewFrame = new Int32Array(overview);
  const flags = columns.findIndex((column) => column.key === 'flags');
  let used = 0;
  let row = 0;
  let picked = 0;
  const flush = () => {
    columns.forEach((column, index) => {
      file.append(column.name, out[index].subarray(0, used));
    });
    file.append('pathline_index', outPathline.subarray(0, used));
    if (kept !== null) file.append('pathlines_row', outRow.subarray(0, used));
    used = 0;
  };
  for await (const { pathline, values, frames } of walkBatches(spilled, columns, context)) {
    for (const { frame, first, end } of frames) {
      const show = shown(frame);
      for (let i = first; i < end; i++) {
        const number = final[pathline[i]];
        if (number < 0) continue;
        const fullRow = next[pathline[i]]++;
        if (!show) continue;
        for (let c = 0; c < values.length; c++) out[c][used] = values[c][i];
        if (stuck[number] === 1) out[flags][used] |= FLAG.stuck;
        outPathline[used] = number;
        const shift = kept === null || kept.shift === null ? 0 : kept.shift[number];
        outRow[used] = shift === LEFT_OUT ? -1 : fullRow + shift;
        if (inOverview(row, samples)) {
          for (let c = 0; c < values.length; c++) few[c][picked] = out[c][used];
          fewPathline[picked] = number;
          fewFrame[picked] = spilled.frameNumber.array[frame];
          picked++;
        }
        row++;
        used++;
        if (used === OUT_ROWS) flush();
      }
    }
  }
  if (used > 0) flush();
  columns.forEach((column, index) => {
    file.append(`overview_${column.name}`, few[index]);
  });
  file.append('overview_pathline', fewPathline);
  file.append('overview_frame', fewFrame);
}

function declare(file: NetcdfWriter, input: FramesInput, frames: number, samples: number, overview: number): void {
  const { numbering, columns, units, kept } = input;
  file.dimension('frame', frames);
  file.dimension('pathline', numbering.pathlines);
  file.dimension('sample', samples);
  file.dimension('overview', overview);
  const integers = (name: string, dimension: string, attributes: Record<string, string>, type: 'i32' | 'i64' = 'i32') =>
    file.variable({ name, type, dimensions: [dimension], attributes });
  integers('frame', 'frame', { long_name: 'frame number in the dump' });
  const time = { long_name: 'elapsed time', units: units.time };
  file.variable({ name: 'time', type: 'f64', dimensions: ['frame'], attributes: time });
  integers('row_size', 'frame', { long_name: 'samples in the frame' });
  integers('first_row', 'frame', { long_name: 'row of the first sample of the frame' }, 'i64');
  integers('pathline', 'pathline', { long_name: 'pathline number', cf_role: 'trajectory_id' });
  const coordinates = columns.some((column) => column.key === 'z') ? 'x y z' : 'x y';
  const attributesOf = (column: SampleColumn) =>
    // The standard errors stand in pathlines.nc.
    columnAttributes({ ...column, standardError: null }, units, coordinates);
  for (const column of columns) {
    file.variable({ name: column.name, type: column.type, dimensions: ['sample'], attributes: attributesOf(column) });
  }
  integers('pathline_index', 'sample', {
    long_name: 'which pathline the sample belongs to',
    instance_dimension: 'pathline',
  });
  if (kept !== null) {
    const meaning = 'row of the sample in pathlines.nc, -1 for a pathline that is not kept there';
    integers('pathlines_row', 'sample', { long_name: meaning });
  }
  for (const column of columns) {
    const { coordinates: _, axis: __, ...attributes } = attributesOf(column);
    file.variable({ name: `overview_${column.name}`, type: column.type, dimensions: ['overview'], attributes });
  }
  integers('overview_pathline', 'overview', { long_name: 'pathline number of the overview sample' });
  integers('overview_frame', 'overview', { long_name: 'frame number of the overview sample' });
}
