import type { RunContext } from '../core/context.js';
import type { ResultPlace } from '../core/result-place.js';
import { columnAttributes, fileAttributes, type ResultUnits, THINNING, thinningAttributes } from './file-attributes.js';
import { type Attributes, createNetcdf, type NetcdfWriter } from './netcdf-writer.js';
import type { Numbering } from './numbering.js';
import type { PathlineRows } from './pathline-rows.js';
import type { SampleColumn } from './sample-columns.js';
import type { Column, Spilled } from './spill.js';

/** pathlines.nc in the making: CF contiguous ragged array of trajectories. */
export interface PathlinesFile {
  /** Rows in the order of the file; borrows them until the promise settles. */
  append(rows: PathlineRows): Promise<void>;
  /** Closes and checks; resolves to the content digest. */
  finish(context: RunContext): Promise<string>;
  abandon(): void;
}

/** Which rows the file holds when every tenth pathline is kept. */
export interface Kept {
  readonly pathlines: number;
  readonly samples: number;
  /** Added to a sample's row among all samples it gives its row in the file; null: no pathline is left out. [pathlines] */
  readonly shift: Int32Array | null;
}

/** Mark in `Kept.shift` for a pathline that is not in the file. */
export const LEFT_OUT = -(2 ** 31);

/** Rows of pathlines.nc under the setting `keep`; memory 4 bytes a pathline when thinned. */
export function keptRows(keep: 'all' | 'thinned', numbering: Numbering, spilled: Spilled): Kept {
  if (keep === 'all') return { pathlines: numbering.pathlines, samples: numbering.samples, shift: null };
  const shift = new Int32Array(numbering.pathlines).fill(LEFT_OUT);
  let samples = 0;
  let row = 0;
  for (let p = 0; p < numbering.final.length; p++) {
    const number = numbering.final[p];
    if (number < 0) continue;
    if (number % THINNING === 0) {
      shift[number] = samples - row;
      samples += spilled.counts.array[p];
    }
    row += spilled.counts.array[p];
  }
  return { pathlines: Math.ceil(numbering.pathlines / THINNING), samples, shift };
}

/** Starts the file. Memory: 16 bytes a pathline kept. */
export async function openPathlinesFile(
  place: ResultPlace,
  columns: readonly SampleColumn[],
  kept: Kept,
  units: ResultUnits,
  title: string,
  bridge: number,
): Promise<PathlinesFile> {
  const thinned = kept.shift !== null;
  const extra: Attributes = {
    missing_frames_crossed_at_most: { type: 'i32', values: [bridge] },
    ...thinningAttributes(thinned ? 'thinned' : 'all'),
  };
  const file = await createNetcdf(place, 'pathlines.nc', fileAttributes(title, 'trajectory', extra));
  try {
    declare(file, columns, kept, units);
  } catch (error) {
    file.abandon();
    throw error;
  }
  const number = new Int32Array(kept.pathlines);
  const rowSize = new Int32Array(kept.pathlines);
  const firstFrame = new Int32Array(kept.pathlines);
  const lastFrame = new Int32Array(kept.pathlines);
  let done = 0;
  return {
    async append(rows) {
      const picked: number[] = [];
      for (let k = 0; k + 1 < rows.offsets.length; k++) {
        const pathline = rows.firstPathline + k;
        if (thinned && kept.shift?.[pathline] === LEFT_OUT) continue;
        number[done] = pathline;
        rowSize[done] = rows.offsets[k + 1] - rows.offsets[k];
        firstFrame[done] = rows.frame[rows.offsets[k]];
        lastFrame[done] = rows.frame[rows.offsets[k + 1] - 1];
        done++;
        if (thinned) picked.push(k);
      }
      // Each is written while the next one is hashed, and no two at a time: they would wait for one another in the system.
      let before: Promise<void> | null = null;
      for (const column of columns) {
        const values = rows[column.key];
        const written = file.append(column.name, thinned ? pick(values, rows.offsets, picked) : values);
        await before;
        before = written;
      }
      await before;
    },
    async finish(context) {
      await file.append('pathline', number);
      await file.append('row_size', rowSize);
      await file.append('first_frame', firstFrame);
      await file.append('last_frame', lastFrame);
      return file.finish(context);
    },
    abandon: () => file.abandon(),
  };
}

function declare(file: NetcdfWriter, columns: readonly SampleColumn[], kept: Kept, units: ResultUnits): void {
  file.dimension('pathline', kept.pathlines);
  file.dimension('sample', kept.samples);
  const pathlineVariable = (name: string, attributes: Record<string, string>) =>
    file.variable({ name, type: 'i32', dimensions: ['pathline'], attributes });
  pathlineVariable('pathline', { long_name: 'pathline number', cf_role: 'trajectory_id' });
  pathlineVariable('row_size', { long_name: 'samples of the pathline', sample_dimension: 'sample' });
  pathlineVariable('first_frame', { long_name: 'frame number of the first sample' });
  pathlineVariable('last_frame', { long_name: 'frame number of the last sample' });
  const coordinates = ['time', 'x', 'y', 'z']
    .filter((name) => columns.some((column) => column.name === name))
    .join(' ');
  for (const column of columns) {
    const attributes = columnAttributes(column, units, coordinates);
    file.variable({ name: column.name, type: column.type, dimensions: ['sample'], attributes });
  }
}

/** Rows of the picked pathlines, new. */
function pick(values: Column, offsets: Uint32Array, picked: readonly number[]): Column {
  const total = picked.reduce((sum, k) => sum + offsets[k + 1] - offsets[k], 0);
  const Type = values.constructor as new (length: number) => Column;
  const out = new Type(total);
  let at = 0;
  for (const k of picked) {
    out.set(values.subarray(offsets[k], offsets[k + 1]), at);
    at += offsets[k + 1] - offsets[k];
  }
  return out;
}
