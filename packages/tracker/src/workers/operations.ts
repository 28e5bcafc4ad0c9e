import type { ByteSource, HasherFactory } from '../core/bytes.js';
import { abortedError } from '../core/errors.js';
import type { Hdf5Opener } from '../core/hdf5.js';
import type { ResultPlace } from '../core/result-place.js';
import type { RunTools } from '../pipeline/board.js';
import { createWorkerClient } from './client.js';
import { fitFramesBody, fitInHelper } from './fit-frames.js';
import type { StartWorker } from './handle.js';
import type { OperationBodies } from './host.js';
import type { KernelOperations, RunOperations, SourceRef } from './operation-table.js';

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

/** Bodies of what every tracker worker answers; to be used once in a worker. */
export const runBodies: OperationBodies<RunOperations, Platform> = {
  ...fitFramesBody(),
  async process({ request, sources, out }, context, platform) {
    // Loaded here, so that a worker that only runs kernels stays small.
    const loaded = Promise.all([import('../pipeline/process-run.js'), platform.hasher(), platform.hdf5()]);
    const [{ processRun }, hasher, hdf5] = await unlessAborted(loaded, context.signal);
    const place = await platform.openPlace(out);
    const helper =
      context.budget.threads > 1 ? createWorkerClient<KernelOperations>(platform.startHelper('tracker 2')) : null;
    const opened: ByteSource[] = [];
    try {
      for (const ref of sources) opened.push(await platform.openSource(ref));
      const tools: RunTools = {
        sources: opened,
        hdf5,
        hasher,
        place,
        fit: helper === null ? undefined : fitInHelper(helper, context),
        host: platform.host,
        clock: { now: () => new Date().toISOString(), seconds: () => performance.now() / 1000 },
      };
      return { value: await processRun(request, tools, context), transfer: [] };
    } finally {
      await Promise.all([helper?.terminate(), ...opened.map((source) => source.close())]);
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
