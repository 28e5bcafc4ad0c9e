import { createDeathWatch, type WorkerHandle } from './handle.js';

/**
 * Handle of a web worker. The page or worker that starts it writes
 * `new Worker(new URL('./tracker.worker.ts', import.meta.url), { type: 'module' })`, which bundlers understand.
 * An uncaught error leaves a web worker running in an unknown state: it counts as dead and is ended.
 */
export function webWorkerHandle(worker: Worker, name: string): WorkerHandle {
  const watch = createDeathWatch();
  worker.addEventListener('error', (event) => {
    event.preventDefault();
    const found = event.message || 'its script could not be loaded or started';
    worker.terminate();
    watch.report({
      code: /out of memory/i.test(found) ? 'worker/out-of-memory' : 'worker/crashed',
      message: `worker "${name}": got an uncaught error (${found}), expected an answer; start the run again`,
      details: { worker: name, error: found },
    });
  });
  worker.addEventListener('messageerror', () => {
    worker.terminate();
    watch.report({
      code: 'worker/unreadable-message',
      message: `worker "${name}": got a message that could not be read, expected an answer; start the run again`,
      details: { worker: name },
    });
  });
  return {
    name,
    endpoint: worker,
    onDeath: watch.onDeath,
    hold: () => {},
    terminate() {
      worker.terminate();
      watch.report({
        code: 'worker/exited',
        message: `worker "${name}": got its end on request, expected an answer`,
        details: { worker: name },
      });
      return Promise.resolve();
    },
  };
}
