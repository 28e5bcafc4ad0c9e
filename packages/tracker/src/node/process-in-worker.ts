import type { ProgressListener, RunEvent } from '../core/context.js';
import type { RunRequest } from '../pipeline/board.js';
import type { RunRecord } from '../store/run-record.js';
import { createWorkerClient } from '../workers/client.js';
import type { RunOperations } from '../workers/operation-table.js';
import { startNodeWorker } from './threads.js';

/** How a run in worker threads is watched and stopped. */
export interface WorkerRunOptions {
  /** Threads that work, at least 1; the calling thread stays free and is not counted. */
  readonly threads: number;
  /** Working memory of the run, bytes. */
  readonly ramLimit: number;
  readonly signal?: AbortSignal;
  readonly onProgress?: ProgressListener;
  readonly onEvent?: (event: RunEvent) => void;
}

/**
 * Works a whole run in worker threads: `processRun` on these files, in this order, into the folder `out`, which is
 * made where it is missing. The threads are gone when the promise has settled. Codes as `processRun` and as
 * `WorkerClient.run`; after an abort the folder is what it was before.
 */
export async function processInWorker(
  request: RunRequest,
  files: readonly string[],
  out: string,
  options: WorkerRunOptions,
): Promise<RunRecord> {
  const client = createWorkerClient<RunOperations>(startNodeWorker({ name: 'tracker 1' }));
  try {
    const sources = files.map((path) => ({ kind: 'path', path }) as const);
    return await client.run(
      'process',
      { request, sources, out },
      {
        signal: options.signal,
        onProgress: options.onProgress,
        onEvent: options.onEvent,
        threads: options.threads,
        bytes: options.ramLimit,
        seed: request.resolved.settings.seed,
      },
    );
  } finally {
    await client.terminate();
  }
}
