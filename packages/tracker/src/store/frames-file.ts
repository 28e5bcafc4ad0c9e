import { FLAG } from '../core/columns.js';
import type { RunContext } from '../core/context.js';
import type { ResultPlace } from '../core/result-place.js';
import { columnAttributes, fileAttributes, type ResultUnits, THINNING, thinningAttributes } from './file-attributes.js';
import { gatherValues } from './move-values.js';
import { createNetcdf, type NetcdfWriter } from './netcdf-writer.js';
import type { Numbering } from './numbering.js';
import { type Kept, LEFT_OUT } from './pathlines-file.js';
import type { SampleColumn } from './sample-columns.js';
import { type Batch, type Column, columnOf, readBatch, type Spilled } from './spill.js';

/** Columns of a sample that frames.nc shows, besides the pathline and its row in pathlines.nc. */
export const FRAME_KEYS = ['x', 'y', 'z', 'u', 'v', 'w', 'flags'] as const;

/** Samples in the overview, at most about (the choice is by row number, see `inOverview`). A screenful; our choice. */
const OVERVIEW_SAMPLES = 1 << 16;

/** What frames.nc is made from. `kept` is null when there is no pathlines.nc. */
export interface FramesInput {
  readonly spilled: Spilled;
  readonly numbering: Numbering;
  readonly kept: Kept | null;
  /** 1 for each stuck pathline. [pathlines] */
  readonly stuck: Uint8Array;
  /** Samples of kept pathlines in each frame, by index of the frame. */
  readonly sizes: Int32Array;
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
 * Writes frames.nc from the spill: CF indexed ragged array, so that each sample has its own `sample_time`;
 * `first_row` and `row_size` by frame. Walks the spill
 * once. Resolves to the content digest.
 */
export async function writeFramesFile(place: ResultPlace, input: FramesInput, context: RunContext): Promise<string> {
  const { spilled, numbering, keep, sizes } = input;
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
  const file = await createNetcdf(
    place,
    'frames.nc',
    fileAttributes(input.title, 'trajectory', thinningAttributes(keep)),
  );
  try {
    declare(file, input, indices.length, samples, overview);
    await file.append(
      'frame',
      Int32Array.from(indices, (frame) => spilled.frameNumber.array[frame]),
    );
    await file.append(
      'time',
      Float64Array.from(indices, (frame) => spilled.frameTime.array[frame]),
    );
    await file.append(
      'row_size',
      Int32Array.from(indices, (frame) => sizes[frame]),
    );
    let first = 0;
    const firstRows = Float64Array.from(indices, (frame) => {
      first += sizes[frame];
      return first - sizes[frame];
    });
    await file.append('first_row', firstRows);
    await file.append(
      'pathline',
      Int32Array.from({ length: numbering.pathlines }, (_, number) => number),
    );
    await writeSamples(file, input, samples, overview, shown, context);
    return await file.finish(context);
  } catch (error) {
    file.abandon();
    throw error;
  }
}

interface FrameBatch {
  readonly batch: Batch;
  /** Place in the batch's columns of each of its rows in frame order. */
  readonly order: Int32Array;
  readonly pathline: Int32Array;
  /** Rows of this batch by frame index. */
  readonly frames: readonly { readonly frame: number; readonly first: number; readonly end: number }[];
}

/** The spill batch by batch, with its frame order. The arrays are used again for the next batch. */
async function* walkBatches(spilled: Spilled, context: RunContext): AsyncGenerator<FrameBatch> {
  const { batches, frameRows } = spilled;
  const most = batches.reduce((rows, batch) => Math.max(rows, batch.rows), 0);
  const allOrder = new Int32Array(most);
  const allPathline = new Int32Array(most);
  let position = 0;
  let frame = 0;
  let left = frameRows.length > 0 ? frameRows.array[0] : 0;
  for (const batch of batches) {
    const order = allOrder.subarray(0, batch.rows);
    const pathline = allPathline.subarray(0, batch.rows);
    spilled.order?.read(position, new Uint8Array(order.buffer, 0, order.byteLength));
    position += order.byteLength;
    readBatch(spilled, batch, -1, 0, pathline);
    const ranges: { frame: number; first: number; end: number }[] = [];
    for (let row = 0; row < batch.rows; ) {
      while (left === 0) left = frameRows.array[++frame];
      const end = Math.min(batch.rows, row + left);
      ranges.push({ frame, first: row, end });
      left -= end - row;
      row = end;
    }
    yield { batch, order, pathline, frames: ranges };
    await context.breathe();
  }
}

/** The columns of the sample dimension, a batch at a time, and the overview out of them. */
async function writeSamples(
  file: NetcdfWriter,
  input: FramesInput,
  samples: number,
  overview: number,
  shown: (frame: number) => boolean,
  context: RunContext,
): Promise<void> {
  const { spilled, numbering, kept, stuck, columns } = input;
  const { final, next } = numbering;
  const most = spilled.batches.reduce((rows, batch) => Math.max(rows, batch.rows), 0);
  const picked = new Int32Array(most);
  const numbers = new Int32Array(most);
  const fileRows = new Int32Array(most);
  const times = new Float64Array(most);
  const read = new ArrayBuffer(8 * most);
  // One for each column: they are written while the next ones are gathered.
  const gathered = columns.map((column) => columnOf(column.stored, most));
  const few = columns.map((column) => columnOf(column.stored, overview));
  const fewPathline = new Int32Array(overview);
  const fewFrame = new Int32Array(overview);
  let row = 0;
  let inFew = 0;
  for await (const { batch, order, pathline, frames } of walkBatches(spilled, context)) {
    const firstRow = row;
    const firstFew = inFew;
    let used = 0;
    for (const { frame, first, end } of frames) {
      const show = shown(frame);
      for (let i = first; i < end; i++) {
        const provisional = pathline[order[i]];
        const number = final[provisional];
        if (number < 0) continue;
        const fullRow = next[provisional]++;
        if (!show) continue;
        picked[used] = order[i];
        numbers[used] = number;
        times[used] = spilled.frameTime.array[frame];
        const shift = kept === null || kept.shift === null ? 0 : kept.shift[number];
        fileRows[used++] = shift === LEFT_OUT ? -1 : fullRow + shift;
        if (inOverview(row++, samples)) {
          fewPathline[inFew] = number;
          fewFrame[inFew++] = spilled.frameNumber.array[frame];
        }
      }
    }
    let before: Promise<void> | null = null;
    const append = async (name: string, values: Column) => {
      // As in pathlines.nc: written while the next one is gathered and hashed.
      const written = file.append(name, values);
      await before;
      before = written;
    };
    for (const [c, column] of columns.entries()) {
      const Type = few[c].constructor as new (buffer: ArrayBuffer, offset: number, length: number) => Column;
      const values = new Type(read, 0, batch.rows);
      const out = gathered[c].subarray(0, used);
      readBatch(spilled, batch, spilled.stored.indexOf(column), 0, values);
      gatherValues(values, picked, used, out);
      if (column.key === 'flags') for (let i = 0; i < used; i++) if (stuck[numbers[i]] === 1) out[i] |= FLAG.stuck;
      let at = firstFew;
      for (let i = 0; i < used; i++) if (inOverview(firstRow + i, samples)) few[c][at++] = out[i];
      await append(column.name, out);
    }
    await append('pathline_index', numbers.subarray(0, used));
    if (kept !== null) await append('pathlines_row', fileRows.subarray(0, used));
    await append('sample_time', times.subarray(0, used));
    await before;
  }
  for (const [index, column] of columns.entries()) await file.append(`overview_${column.name}`, few[index]);
  await file.append('overview_pathline', fewPathline);
  await file.append('overview_frame', fewFrame);
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
  const coordinates = columns.some((column) => column.key === 'z') ? 'sample_time x y z' : 'sample_time x y';
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
  // CF conventions, chapter 5: a coordinate spans no dimension that its variable has not, so that the time by frame
  // does not place a sample.
  const sampleTime = { long_name: 'elapsed time of the sample', units: units.time };
  file.variable({ name: 'sample_time', type: 'f64', dimensions: ['sample'], attributes: sampleTime });
  for (const column of columns) {
    const { coordinates: _, axis: __, ...attributes } = attributesOf(column);
    file.variable({ name: `overview_${column.name}`, type: column.type, dimensions: ['overview'], attributes });
  }
  integers('overview_pathline', 'overview', { long_name: 'pathline number of the overview sample' });
  integers('overview_frame', 'overview', { long_name: 'frame number of the overview sample' });
}
