import { WakeloomError } from '../core/errors.js';
import type { RunOptions, WorkerClient } from './client.js';
import { mapOrdered, type Task } from './map-ordered.js';
import type { OperationName, OperationTable } from './protocol.js';

/** Runs pure operations in the workers of a pool. */
export interface KernelRunner<Table extends OperationTable> {
  /** Operations that run at the same time. */
  readonly width: number;
  /** Runs one operation as soon as a worker is free; errors as `WorkerClient.run`, and `worker/none-left`. */
  run<Name extends OperationName<Table>>(
    operation: Name,
    args: Table[Name]['args'],
    options?: RunOptions,
  ): Promise<Table[Name]['value']>;
  /**
   * Values in the order of the tasks, at most `limit` tasks taken and not yet delivered (default: twice the
   * width). The first failure ends it and aborts what is in flight.
   */
  mapOrdered<Name extends OperationName<Table>>(
    operation: Name,
    tasks: AsyncIterable<Task<Table[Name]['args']>>,
    options?: Omit<RunOptions, 'transfer'> & { readonly limit?: number },
  ): AsyncGenerator<Table[Name]['value']>;
  /** Ends the workers; what is in flight rejects. */
  terminate(): Promise<void>;
}

interface Waiting<Table extends OperationTable> {
  readonly start: (client: WorkerClient<Table>) => void;
  readonly fail: (error: WakeloomError) => void;
}

/**
 * Pool over started workers, one operation at a time in each, first come first served. A dead worker's
 * operation rejects and the others go on without it; when none is left, what waits rejects with
 * `worker/none-left`. The pool holds its clients, so that comlink's proxies are not collected in flight.
 */
export function createPool<Table extends OperationTable>(clients: readonly WorkerClient<Table>[]): KernelRunner<Table> {
  const idle = [...clients];
  const waiting: Waiting<Table>[] = [];
  let alive = clients.length;
  for (const client of clients) {
    client.onDeath(() => {
      alive--;
      const place = idle.indexOf(client);
      if (place >= 0) idle.splice(place, 1);
      if (alive === 0) for (const task of waiting.splice(0)) task.fail(noneLeft(clients));
    });
  }

  function release(client: WorkerClient<Table>): void {
    if (client.death !== null) return;
    const next = waiting.shift();
    if (next === undefined) idle.push(client);
    else next.start(client);
  }

  function acquire(): Promise<WorkerClient<Table>> {
    if (alive === 0) return Promise.reject(noneLeft(clients));
    const client = idle.shift();
    if (client !== undefined) return Promise.resolve(client);
    return new Promise((start, fail) => waiting.push({ start, fail }));
  }

  async function run<Name extends OperationName<Table>>(
    operation: Name,
    args: Table[Name]['args'],
    options?: RunOptions,
  ): Promise<Table[Name]['value']> {
    const client = await acquire();
    try {
      return await client.run(operation, args, options);
    } finally {
      release(client);
    }
  }

  return {
    width: clients.length,
    run,
    mapOrdered: (operation, tasks, options = {}) =>
      mapOrdered(tasks, options.limit ?? 2 * clients.length, options.signal, (task, signal) =>
        run(operation, task.args, { ...options, signal, transfer: task.transfer }),
      ),
    async terminate() {
      await Promise.all(clients.map((client) => client.terminate()));
    },
  };
}

function noneLeft(clients: readonly WorkerClient<OperationTable>[]): WakeloomError {
  const last = clients.map((client) => client.death?.message).find((message) => message !== undefined);
  return new WakeloomError(
    'worker/none-left',
    `worker pool: got no living worker of ${clients.length}, expected at least one (${last ?? 'none was started'}); start the run again`,
    { workers: clients.length },
  );
}
