import { WakeloomError } from '@wakeloom/tracker/core/errors';
import type { ResolvedRun } from '@wakeloom/tracker/run/settings';
import type { RunRecord } from '@wakeloom/tracker/store/run-record';
import type { Hooks } from './hooks.js';

/** What a run is started with: everything in it has been checked. */
export interface ProcessRequest {
  readonly run: ResolvedRun;
  /** Existing files of the dump in reading order. */
  readonly files: readonly string[];
  /** Existing, writable folder. */
  readonly out: string;
}

/** Hands the run to the tracker's worker threads. */
export function processRun(request: ProcessRequest, _hooks: Hooks): Promise<RunRecord> {
  throw new WakeloomError(
    'run/not-joined',
    `process: got ${request.files.length} files, expected the joined pipeline, which is not there yet`,
  );
}
