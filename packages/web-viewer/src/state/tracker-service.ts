import { createWorkerClient, type WorkerClient } from '@wakeloom/tracker/workers/client';
import type { PageOperations } from '@wakeloom/tracker/workers/operation-table';
import { webWorkerHandle } from '@wakeloom/tracker/workers/start-web';

/** Gives the page's worker; one that has died is replaced by a new one, and what it held is gone. */
export type TrackerService = () => WorkerClient<PageOperations>;

/** Starts nothing until first asked. */
export function createTrackerService(): TrackerService {
  let client: WorkerClient<PageOperations> | null = null;
  return () => {
    if (client === null || client.death !== null) {
      const worker = new Worker(new URL('../tracker.worker.ts', import.meta.url), {
        type: 'module',
        name: 'tracker 1',
      });
      client = createWorkerClient<PageOperations>(webWorkerHandle(worker, 'tracker 1'));
    }
    return client;
  };
}
