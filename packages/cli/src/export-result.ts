import type { ByteSink } from '@wakeloom/tracker/core/bytes';
import { createContext } from '@wakeloom/tracker/core/context';
import { WakeloomError } from '@wakeloom/tracker/core/errors';
import type { ExportSummary } from '@wakeloom/tracker/store/exports/table';
import type { Hooks } from './hooks.js';

/** What to export, checked as far as it goes without opening the result. */
export interface ExportWish {
  readonly folder: string;
  readonly what: 'pathlines' | 'grid';
  readonly format: string;
  /** As typed, or null. */
  readonly normalise: string | null;
}

export async function openExport(wish: ExportWish): Promise<ExportWish> {
  return wish;
}

export async function exportResult(_wish: ExportWish, _sink: ByteSink, hooks: Hooks): Promise<ExportSummary> {
  createContext({ signal: hooks.signal });
  throw new WakeloomError('run/not-joined', 'export: the reader of results is not joined yet');
}
