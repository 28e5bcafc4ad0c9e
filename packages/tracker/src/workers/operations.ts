import type { ByteSource, HasherFactory } from '../core/bytes.js';
import type { RunContext } from '../core/context.js';
import { abortedError } from '../core/errors.js';
import type { Hdf5Opener } from '../core/hdf5.js';
import type { ResultPlace } from '../core/result-place.js';
import type { FitRunner } from '../kinematics/fit-stage.js';
import { fitWindowInSteps } from '../kinematics/fit-window.js';
import type { RunTools } from '../pipeline/board.js';
import { createWorkerClient } from './client.js';
import type { StartWorker } from './handle.js';
import type { OperationBodies } from './host.js';
import type { KernelOperations, RunOperations, SourceRef } from './operation-table.js';
import { createPool, type KernelRunner } from './pool.js';
import { buffersIn } from './transfer.js';

/** What the operations need from where they run; `entry-node.ts` and `entry-web.ts` differ in this and nowhere else. */
export interface Platform {
  openSource(ref: SourceRef): Promise<ByteSource>;
  openPlace(out: string): Promise<ResultPlace>;
  hasher(): Promise<HasherFactory>;
  hdf5(): Promise<Hdf5Opener>;
  /** Starts a further worker that answers `KernelOperations`. */
  readonly startHelper: StartWorker;
  readonly host: RunTools['host'];
}

const kernelBodies: OperationBodies<KernelOperations, Platform> = {
  async 'fit-window'({ window, core, parameters }, context) {
    const steps = fitWindowInSteps(window, core, parameters);
    for (;;) {
      await context.breathe();
      const step = steps.next();
      if (step.done) return { value: step.value, transfer: buffersIn(step.value) };
    }
  },
};

/** Bodies of what every tracker worker answers. */
export const runBodies: OperationBodies<RunOperations, Platform> = {
  ...kernelBodies,
  async process({ request, sources, out }, context, platform) {
    // Loaded here, so that a worker that only runs kernels stays small.
    const loaded = Promise.all([import('../pipeline/process-run.js'), platform.hasher(), platform.hdf5()]);
    const [{ processRun }, hasher, hdf5] = await unlessAborted(loaded, context.signal);
    const place = await platform.openPlace(out);
    const helpers = startHelpers(platform.startHelper, context.budget.threads - 1);
    const opened: ByteSource[] = [];
    try {
      for (const ref of sources) opened.push(await platform.openSource(ref));
      const tools: RunTools = {
        sources: opened,
        hdf5,
        hasher,
        place,
        fit: helpers === null ? undefined : fitIn(helpers, context),
        host: platform.host,
        clock: { now: () => new Date().toISOString(), seconds: () => performance.now() / 1000 },
      };
      return { value: await processRun(request, tools, context), transfer: [] };
    } finally {
      await Promise.all([helpers?.terminate(), ...opened.map((source) => source.close())]);
    }
  },
};

/** The value when it comes, or `run/aborted` as soon as the signal fires: for waits that have nothing to clear up. */
function unlessAborted<Value>(value: Promise<Value>, signal: AbortSignal): Promise<Value> {
  return new Promise((resolve, reject) => {
    const abort = (): void => reject(abortedError());
    if (signal.aborted) return abort();
    signal.addEventListener('abort', abort);
    value.then(resolve, reject).finally(() => signal.removeEventListener('abort', abort));
  });
}

/** A pool of further workers; null where there is to be none, and the coordinator runs the kernels itself. */
function startHelpers(start: StartWorker, count: number): KernelRunner<KernelOperations> | null {
  if (!(count >= 1)) return null;
  const clients = Array.from({ length: count }, (_, i) =>
    createWorkerClient<KernelOperations>(start(`tracker ${i + 2}`)),
  );
  return createPool(clients);
}

function fitIn(helpers: KernelRunner<KernelOperations>, context: RunContext): FitRunner {
  return (window, core, parameters) =>
    helpers.run(
      'fit-window',
      { window, core, parameters },
      { signal: context.signal, transfer: buffersIn(window), bytes: context.budget.bytes },
    );
}
