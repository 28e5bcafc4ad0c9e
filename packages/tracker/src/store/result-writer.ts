import type { Dims, FlagName, SampleBlock } from '../core/columns.js';
import type { RunContext } from '../core/context.js';
import { PARTIAL_PREFIX, type ResultPlace } from '../core/result-place.js';
import type { GridResult } from '../eulerian/grid.js';
import { folderDigest } from './digest.js';
import { checkRoom } from './disk-space.js';
import { FRAME_KEYS, writeFramesFile } from './frames-file.js';
import { writeGridFile } from './grid-file.js';
import type { Attributes } from './netcdf-writer.js';
import { numberPathlines, rewind } from './numbering.js';
import type { PathlineRows } from './pathline-rows.js';
import { keptRows, openPathlinesFile, type PathlinesFile } from './pathlines-file.js';
import type { RunRecord } from './run-record.js';
import { sampleColumns } from './sample-columns.js';
import { sampleStatistics } from './sample-statistics.js';
import { openSpill, rowBytes, type Spill, spillBytes } from './spill.js';
import { flagStuck } from './stuck.js';
import { clearPartials, clearResult, swapIn, withEarlierResult } from './swap-result.js';
import { transpose } from './transpose.js';

/** What a result folder is made with. Lengths in units.length. */
export interface ResultWriterOptions {
  readonly dims: Dims;
  /** Image pairs: no acceleration columns; every sample is a link of its own. */
  readonly pairs: boolean;
  readonly units: { readonly length: string; readonly time: string };
  /** Fewest samples of a pathline that is kept. */
  readonly shortest: number;
  /** Missing frames a pathline may cross; noted in pathlines.nc. */
  readonly bridge: number;
  readonly keepPathlines: 'all' | 'thinned' | 'none';
  readonly keepFrames: 'all' | 'thinned' | 'none';
  /** A pathline that stays within this many standard deviations of `noise` along every axis is stuck. */
  readonly stuckFactor: number;
  readonly noise: readonly [number, number, number];
  /** Fewest samples of a pathline that can be called stuck; default `shortest`. */
  readonly stuckFewest?: number;
  /** Step of the frame numbers of frames that follow one another; default 1. */
  readonly frameStep?: number;
  /** Working memory of the run, bytes. The writer takes about 75 MB whatever the limit (measured, in the plane). */
  readonly ramLimit: number;
  readonly context: RunContext;
  /** Title of the files; default `run`. */
  readonly title?: string;
  /** Samples to expect, where known: room for them is checked before anything is written. */
  readonly expectedSamples?: number;
  /** Rows spilled at once and bytes of pathlines assembled at once; the files do not depend on them. */
  readonly working?: { readonly batchRows: number; readonly groupBytes: number };
}

/** What `finish` counted. Speeds and standard error: samples without a flag that excludes them from the grid. */
export interface FinishedSamples {
  readonly samples: number;
  readonly pathlines: number;
  /** Pathlines of two or more but fewer than `shortest` samples, and the detections in them: dropped. */
  readonly shortFragments: number;
  readonly shortFragmentDetections: number;
  readonly links: number;
  readonly linksBridging: number;
  readonly flagged: Readonly<Record<FlagName, number>>;
  readonly unflagged: number;
  readonly medianPathlineSamples: number;
  readonly meanSpeed: number;
  readonly peakSpeed: number;
  readonly medianVelocitySe: number;
}

/** The text of report.html, or how to make it from the whole record. */
export type ReportText = string | ((record: RunRecord) => string);

/**
 * Makes one result folder: `add` blocks, `finish`, `writeGrid`, `complete`, in this order. Whatever fails removes the
 * partial files; the folder is then what it was before: no result, or the earlier one. Codes: `store/disk-full`,
 * `store/read-back`, `store/not-writable`, `store/too-many-samples`, `store/bad-block`, `run/aborted`.
 */
export interface ResultWriter {
  /** Frames in ascending order; takes the block. */
  add(block: SampleBlock): Promise<void>;
  /** Hands out whole pathlines in the order of their numbers, then leaves pathlines.nc and frames.nc written and read back. */
  finish(onPathlines: (rows: PathlineRows) => void | Promise<void>): Promise<FinishedSamples>;
  writeGrid(grid: GridResult, attributes: Attributes): Promise<void>;
  /** Writes report.html, log.ndjson and run.json, then lets all files take their names; resolves to the record as written. */
  complete(record: Omit<RunRecord, 'digest'>, report: ReportText, logLines: readonly string[]): Promise<RunRecord>;
  /** Removes what was begun. To be called when anything else of the run fails; no error when all is done. */
  abandon(): void;
}

/**
 * Starts a result in the folder. An earlier complete one stays as it is until `complete` puts the new one in its
 * place; the disk holds both meanwhile. What is left of a run that was cut short goes at once. Memory: about 75 MB in
 * the plane, of which 25 bytes a pathline, whatever the number of samples. Disk while it works: 98 bytes a sample in
 * scratch files, beside 98 for pathlines.nc and 42 for frames.nc. Time: bench/cases/store.mjs.
 */
export function openResultWriter(place: ResultPlace, options: ResultWriterOptions): ResultWriter {
  const { dims, pairs, units, context, keepPathlines, keepFrames } = options;
  const title = options.title ?? 'run';
  const columns = sampleColumns(dims, pairs);
  const frameColumns = FRAME_KEYS.flatMap((key) => columns.filter((column) => column.key === key));
  clearPartials(place);
  if (place.size('run.json') < 0) clearResult(place);
  const withFrames = keepFrames !== 'none';
  const fileBytes = (keepPathlines === 'none' ? 0 : rowBytes(columns)) + (withFrames ? rowBytes(frameColumns) + 16 : 0);
  if (options.expectedSamples !== undefined) {
    try {
      checkRoom(place, options.expectedSamples * (spillBytes(columns, withFrames) + fileBytes));
    } catch (error) {
      throw withEarlierResult(error, place);
    }
  }
  let spill: Spill | null = openSpill(place, columns, withFrames, options.working?.batchRows);
  let pathlinesFile: PathlinesFile | null = null;
  let swapping = false;
  let completed = false;
  const digests: Record<string, string> = {};

  const abandon = () => {
    pathlinesFile?.abandon();
    pathlinesFile = null;
    spill?.discard();
    spill = null;
    // Files that were done already are of no use without the others, and take the room a rerun needs.
    if (completed) return;
    if (swapping) clearResult(place);
    else clearPartials(place);
  };
  const guard = async <T>(work: () => Promise<T>): Promise<T> => {
    try {
      return await work();
    } catch (error) {
      try {
        abandon();
      } catch {
        // What went wrong first is what to tell; the folder has no new run.json in any case.
      }
      throw withEarlierResult(error, place);
    }
  };
  const inUse = (): Spill => {
    if (spill === null)
      throw new Error('result writer: add and finish come once, in this order, before anything failed');
    return spill;
  };

  const finish = async (onPathlines: (rows: PathlineRows) => void | Promise<void>): Promise<FinishedSamples> => {
    const open = inUse();
    const spilled = open.finish();
    const numbering = numberPathlines(spilled.counts, options.shortest);
    checkRoom(place, numbering.samples * fileBytes + 20 * numbering.pathlines);
    const kept = keepPathlines === 'none' ? null : keptRows(keepPathlines, numbering, spilled);
    if (kept !== null) pathlinesFile = await openPathlinesFile(place, columns, kept, units, title, options.bridge);
    const stuck = new Uint8Array(numbering.pathlines);
    const rule = {
      factor: options.stuckFactor,
      noise: options.noise,
      shortest: options.stuckFewest ?? options.shortest,
    };
    const statistics = sampleStatistics(options.frameStep);
    const sizes = new Int32Array(spilled.frameRows.length);
    const groups = transpose(spilled, numbering, columns, sizes, context, options.working?.groupBytes);
    for await (const rows of groups) {
      flagStuck(rows, rule, stuck);
      statistics.add(rows);
      // The rows are written while they are looked at.
      const written = pathlinesFile?.append(rows);
      written?.catch(() => {});
      await onPathlines(rows);
      await written;
      context.progress('write', rows.firstRow + rows.flags.length, numbering.samples, 'samples');
    }
    if (pathlinesFile !== null) digests['pathlines.nc'] = await pathlinesFile.finish(context);
    pathlinesFile = null;
    rewind(numbering, spilled.counts);
    if (withFrames) {
      const input = { spilled, numbering, kept, stuck, sizes, columns: frameColumns, keep: keepFrames, units, title };
      digests['frames.nc'] = await writeFramesFile(place, input, context);
    }
    open.discard();
    spill = null;
    const { samples, pathlines, shortFragments, shortFragmentDetections } = numbering;
    return {
      samples,
      pathlines,
      shortFragments,
      shortFragmentDetections,
      links: pairs ? samples : samples - pathlines,
      medianPathlineSamples: numbering.medianSamples,
      ...statistics.figures(),
    };
  };

  const complete = async (record: Omit<RunRecord, 'digest'>, report: ReportText, logLines: readonly string[]) => {
    const put = async (file: string, text: string) => {
      checkRoom(place, text.length);
      place.writeText(PARTIAL_PREFIX + file, text);
      await place.sync(PARTIAL_PREFIX + file);
    };
    const content = folderDigest(place.hasher, digests);
    const full: RunRecord = { ...record, digest: { content, files: { ...digests } } };
    await put('report.html', typeof report === 'string' ? report : report(full));
    await put('log.ndjson', logLines.map((line) => `${line}\n`).join(''));
    await put('run.json', `${JSON.stringify(full, null, 2)}\n`);
    // From here on nothing waits: an abort comes before or not at all.
    swapping = true;
    swapIn(place, [...Object.keys(digests), 'report.html', 'log.ndjson', 'run.json']);
    completed = true;
    return full;
  };

  return {
    add: (block) =>
      guard(async () => {
        inUse().add(block);
        await context.breathe();
      }),
    finish: (onPathlines) => guard(() => finish(onPathlines)),
    writeGrid: (grid, attributes) =>
      guard(async () => {
        digests['grid.nc'] = await writeGridFile(place, grid, units, title, attributes, context);
      }),
    complete: (record, report, logLines) => guard(() => complete(record, report, logLines)),
    abandon,
  };
}
