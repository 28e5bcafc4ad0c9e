import { startNodeWorker } from '@wakeloom/tracker/node/threads';
import { createWorkerClient, type WorkerClient } from '@wakeloom/tracker/workers/client';

/** Operations of fault-worker.mjs. */
export type FaultOperations = {
  spin: { args: { milliseconds: number; breathes: boolean }; value: number };
  'double-all': { args: { numbers: Float64Array }; value: { doubled: Float64Array; thread: number } };
  'wait-then-name': { args: { name: string; milliseconds: number }; value: { name: string; thread: number } };
  'fail-coded': { args: { row: number }; value: never };
  'fail-plain': { args: null; value: never };
  report: { args: null; value: { bytes: number; threads: number; seed: number } };
  'crash-in-timer': { args: null; value: never };
  'crash-in-promise': { args: null; value: never };
  exit: { args: { exitCode: number }; value: never };
  'exhaust-heap': { args: null; value: never };
  'exhaust-buffers': { args: { typed: boolean }; value: number };
  'wrong-length': { args: null; value: number };
  'return-function': { args: null; value: () => number };
};

/** Starts one worker with the operations above; `graceMs` as in `createWorkerClient`. */
export function startFaultWorker(
  name = 'faults',
  options: { maxHeapMb?: number; graceMs?: number } = {},
): WorkerClient<FaultOperations> {
  const handle = startNodeWorker({
    name,
    entry: new URL('./fault-worker.mjs', import.meta.url),
    resourceLimits: options.maxHeapMb === undefined ? undefined : { maxOldGenerationSizeMb: options.maxHeapMb },
  });
  return createWorkerClient<FaultOperations>(handle, options.graceMs);
}
