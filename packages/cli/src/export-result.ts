import type { ByteSink } from '@wakeloom/tracker/core/bytes';
import { createContext } from '@wakeloom/tracker/core/context';
import { WakeloomError } from '@wakeloom/tracker/core/errors';
import { openNodeResultPlace } from '@wakeloom/tracker/node';
import { type ExportOptions, exportGrid, exportPathlines } from '@wakeloom/tracker/store/exports/registry';
import type { ExportSummary } from '@wakeloom/tracker/store/exports/table';
import { openResult, type ResultReader } from '@wakeloom/tracker/store/read-result';
import { verifyResult } from '@wakeloom/tracker/store/verify-result';
import type { Hooks } from './hooks.js';
import { readNormalisation } from './normalise.js';

/** Reads the whole result back against its digest. Codes: those of `verifyResult`. */
export async function verifyFolder(folder: string, hooks: Hooks): Promise<void> {
  const context = createContext({ signal: hooks.signal, onProgress: hooks.onProgress, onEvent: hooks.onEvent });
  await verifyResult(await openNodeResultPlace(folder, { create: false }), context);
}

/** What to export, checked as far as it goes without opening the result. */
export interface ExportWish {
  readonly folder: string;
  readonly what: 'pathlines' | 'grid';
  readonly format: string;
  /** As typed, or null. */
  readonly normalise: string | null;
}

/** An opened result and what is wanted of it; `close` it. */
export interface OpenedExport {
  write(sink: ByteSink, hooks: Hooks): Promise<ExportSummary>;
  close(): void;
}

/** Opens the result and reads the normalisation in its units. Codes: those of `openResult`, `usage/normalise`. */
export async function openExport(wish: ExportWish): Promise<OpenedExport> {
  const result = await openResult(await openNodeResultPlace(wish.folder, { create: false }));
  try {
    const { lengthUnit, timeUnit } = result.record.figures;
    const units = { length: lengthUnit, time: timeUnit };
    const normalise = wish.normalise === null ? undefined : readNormalisation(wish.normalise, units);
    return {
      write(sink, hooks) {
        const context = createContext({ signal: hooks.signal, onProgress: hooks.onProgress, onEvent: hooks.onEvent });
        return writeExport(result, wish, sink, { normalise, context });
      },
      close: () => result.close(),
    };
  } catch (error) {
    result.close();
    throw error;
  }
}

function writeExport(
  result: ResultReader,
  wish: ExportWish,
  sink: ByteSink,
  options: ExportOptions,
): Promise<ExportSummary> {
  const { lengthUnit, timeUnit } = result.record.figures;
  if (wish.what === 'grid') {
    const grid = result.grid();
    if (grid === null) throw notKept('grid', wish.folder);
    return exportGrid(grid, { length: lengthUnit, time: timeUnit }, wish.format, sink, options);
  }
  if (result.pathlines === null) throw notKept('pathlines', wish.folder);
  return exportPathlines(result.pathlines, wish.format, sink, options);
}

function notKept(what: string, folder: string): WakeloomError {
  return new WakeloomError(
    'store/not-kept',
    `export: got a result without ${what}, expected one that kept them (${folder}); process the run with --keep-pathlines all`,
    { path: folder },
  );
}
