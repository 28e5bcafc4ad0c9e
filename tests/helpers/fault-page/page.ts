import { createWorkerClient, type WorkerClient } from '@wakeloom/tracker/workers/client';
import { webWorkerHandle } from '@wakeloom/tracker/workers/start-web';
import { buffersOf } from '@wakeloom/tracker/workers/transfer';
import type { WebFaultOperations } from './operations.js';

/** What the tests reach in the page. */
export interface FaultPage {
  start(graceMs?: number): WorkerClient<WebFaultOperations>;
  startMissing(): WorkerClient<WebFaultOperations>;
  buffersOf: typeof buffersOf;
  /** The code a call rejects with, or `resolved`. */
  codeOf(call: Promise<unknown>): Promise<string>;
}

const page: FaultPage = {
  start(graceMs) {
    const worker = new Worker(new URL('./fault.worker.ts', import.meta.url), { type: 'module' });
    return createWorkerClient<WebFaultOperations>(webWorkerHandle(worker, 'faults'), graceMs);
  },
  startMissing() {
    return createWorkerClient<WebFaultOperations>(
      webWorkerHandle(new Worker('./no-such-worker.js', { type: 'module' }), 'missing'),
    );
  },
  buffersOf,
  codeOf: (call) =>
    call.then(
      () => 'resolved',
      (error: { code?: string }) => error.code ?? 'no code',
    ),
};

(globalThis as { faultPage?: FaultPage }).faultPage = page;
