import { processInWorker } from '@wakeloom/tracker/node/process-in-worker';
import type { ResolvedRun } from '@wakeloom/tracker/run/settings';
import type { RunRecord } from '@wakeloom/tracker/store/run-record';
import type { Hooks } from './hooks.js';
import { programVersion } from './version.js';

/** What a run is started with: everything in it has been checked. */
export interface ProcessRequest {
  readonly run: ResolvedRun;
  /** Existing files of the dump in reading order. */
  readonly files: readonly string[];
  /** Existing, writable folder. */
  readonly out: string;
}

/** Hands the run to the tracker's worker threads, so that this thread stays free for progress and Ctrl-C. */
export function processRun(request: ProcessRequest, hooks: Hooks): Promise<RunRecord> {
  const { threads, ramLimit } = request.run.settings.results;
  const job = { resolved: request.run, programVersion: programVersion() };
  return processInWorker(job, request.files, request.out, { threads, ramLimit, ...hooks });
}
