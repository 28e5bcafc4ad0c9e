/// <reference path="./comlink-node-adapter.d.ts" />
import { type ResourceLimits, Worker } from 'node:worker_threads';
import nodeEndpoint from 'comlink/dist/esm/node-adapter.mjs';
import { createDeathWatch, type WorkerHandle } from '../workers/handle.js';

/** How to start a worker thread. */
export interface NodeWorkerOptions {
  /** For messages and debuggers. */
  readonly name?: string;
  /** Script of the worker, built JavaScript; default: the tracker's own entry. */
  readonly entry?: URL;
  /** Limits of its heap; typed arrays live outside the heap and are not bounded by these. */
  readonly resourceLimits?: ResourceLimits;
}

/**
 * The tracker's worker entry. Threads run built JavaScript only (Node 20 reads no TypeScript), so that a caller
 * running from the sources gets the build beside them.
 */
function defaultEntry(): URL {
  const fromSources = /\/src\/node\/[^/]*$/.test(import.meta.url);
  return new URL(fromSources ? '../../dist/workers/entry-node.js' : '../workers/entry-node.js', import.meta.url);
}

/**
 * Room for young objects in a worker, MB. The default (48) lets dead typed arrays, which count for little there, pile up
 * until it is full: 30 to 40 MB of a run's peak (measured on two million detections, same speed).
 */
const YOUNG_MEGABYTES = 12;

/** Starts a worker thread. It does not keep the process up unless held (see `WorkerHandle.hold`). */
export function startNodeWorker(options: NodeWorkerOptions = {}): WorkerHandle {
  const name = options.name ?? 'tracker';
  const worker = new Worker(options.entry ?? defaultEntry(), {
    name,
    resourceLimits: { maxYoungGenerationSizeMb: YOUNG_MEGABYTES, ...options.resourceLimits },
    // Without the flags of this process: an export condition that leads to TypeScript must not reach a thread.
    execArgv: [],
  });
  worker.unref();
  const watch = createDeathWatch();

  worker.on('error', (error: Error & { code?: string }) => {
    const outOfMemory = error.code === 'ERR_WORKER_OUT_OF_MEMORY';
    const found = error.message || String(error);
    watch.report({
      code: outOfMemory ? 'worker/out-of-memory' : 'worker/crashed',
      message: outOfMemory
        ? `memory of worker "${name}": got none left (${found}), expected room; use larger bins, a lower --ram-limit or a computer with more memory`
        : `worker "${name}": got an uncaught error (${found}), expected an answer; start the run again`,
      details: { worker: name, error: found },
    });
  });
  worker.on('messageerror', (error) => {
    watch.report({
      code: 'worker/unreadable-message',
      message: `worker "${name}": got a message that could not be read (${error.message}), expected an answer; start the run again`,
      details: { worker: name, error: error.message },
    });
    void worker.terminate();
  });
  worker.on('exit', (exitCode) => {
    watch.report({
      code: 'worker/exited',
      message: `worker "${name}": got its end (exit code ${exitCode}), expected an answer`,
      details: { worker: name, exitCode },
    });
  });

  return {
    name,
    endpoint: nodeEndpoint(worker),
    onDeath: watch.onDeath,
    hold(held) {
      if (held) worker.ref();
      else worker.unref();
    },
    async terminate() {
      await worker.terminate();
    },
  };
}
