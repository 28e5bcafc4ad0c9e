import type { Endpoint } from 'comlink';
import type { Death } from './protocol.js';

/**
 * A started worker thread of either kind, as the client sees it: made by `node/threads.ts` from a
 * worker_threads Worker and by `workers/start-web.ts` from a web worker.
 */
export interface WorkerHandle {
  /** For messages. */
  readonly name: string;
  readonly endpoint: Endpoint;
  /** Called at most once, when the thread can answer no more; at once where that has happened already. */
  onDeath(listener: (death: Death) => void): void;
  /** While held, a Node process stays up for the worker; an idle worker keeps no process up. No effect in browsers. */
  hold(held: boolean): void;
  /** Ends the thread, whatever it does; `onDeath` is then called with `worker/exited`. */
  terminate(): Promise<void>;
}

/** Starts one more worker of the same kind. */
export type StartWorker = (name: string) => WorkerHandle;

/** Keeps the first cause of death and tells it to listeners whenever they come. */
export function createDeathWatch(): { report(death: Death): void; onDeath(listener: (death: Death) => void): void } {
  let known: Death | null = null;
  const listeners: ((death: Death) => void)[] = [];
  return {
    report(death) {
      if (known !== null) return;
      known = death;
      for (const listener of listeners.splice(0)) listener(death);
    },
    onDeath(listener) {
      if (known === null) listeners.push(listener);
      else listener(known);
    },
  };
}
