import { type Remote, transfer as withTransfer, wrap } from 'comlink';
import type { ProgressListener, RunEvent } from '../core/context.js';
import { abortedError, fromPlainError, WakeloomError } from '../core/errors.js';
import type { WorkerHandle } from './handle.js';
import {
  type AbortMessage,
  type Call,
  type CallLimits,
  type Death,
  isNotice,
  type OperationName,
  type OperationTable,
  type Outcome,
  type RemoteHost,
} from './protocol.js';

/** Options of one call. */
export interface RunOptions extends CallLimits {
  /** Fires: the worker is asked to stop and the call rejects with `run/aborted`. */
  readonly signal?: AbortSignal;
  /** Buffers in the arguments that move (see transfer.ts); the caller drops them in the same statement. */
  readonly transfer?: readonly ArrayBuffer[];
  readonly onProgress?: ProgressListener;
  readonly onEvent?: (event: RunEvent) => void;
}

/** One worker, seen from the thread that calls it. Hold it as long as calls run. */
export interface WorkerClient<Table extends OperationTable> {
  readonly name: string;
  /** Calls sent and not settled. */
  readonly pending: number;
  /** Why the worker can answer no more; null while it lives. */
  readonly death: Death | null;
  /**
   * Calls an operation. Always settles: with the value, with the operation's own coded error, or with
   * `run/aborted`, `worker/crashed`, `worker/exited`, `worker/out-of-memory`, `worker/unreadable-message`,
   * `worker/not-serialisable` (arguments or value cannot be sent).
   */
  run<Name extends OperationName<Table>>(
    operation: Name,
    args: Table[Name]['args'],
    options?: RunOptions,
  ): Promise<Table[Name]['value']>;
  onDeath(listener: (death: Death) => void): void;
  /** Ends the worker; calls in flight reject with `worker/exited`. */
  terminate(): Promise<void>;
}

/** How long an operation may take to stop after an abort before its worker is ended, ms: forty breaths of 25 ms, doubled. */
const GRACE_MS = 2000;

interface Pending {
  /** The worker has started on it; what is aborted before has nothing to clear up and need not be waited for. */
  begun: boolean;
  readonly reject: (error: WakeloomError) => void;
  readonly options: RunOptions;
}

/**
 * Wraps a started worker, exactly once. comlink itself never settles a call whose worker has died, so every
 * call in flight stands in a table whose entries are rejected when the handle reports a death.
 */
export function createWorkerClient<Table extends OperationTable>(
  handle: WorkerHandle,
  graceMs: number = GRACE_MS,
): WorkerClient<Table> {
  const remote = wrap<RemoteHost>(handle.endpoint);
  const pending = new Map<number, Pending>();
  let nextId = 1;
  let death: Death | null = null;

  handle.endpoint.addEventListener('message', (event) => {
    const data = (event as MessageEvent<unknown>).data;
    if (!isNotice(data)) return;
    const call = pending.get(data.call);
    if (call === undefined) return;
    if (data.wakeloom === 'begun') call.begun = true;
    else if (data.wakeloom === 'progress') call.options.onProgress?.(data.stage, data.done, data.total, data.unit);
    else call.options.onEvent?.(data.event);
  });

  handle.onDeath((cause) => {
    death = cause;
    for (const call of [...pending.values()]) call.reject(deathError(cause));
  });

  function run<Name extends OperationName<Table>>(
    operation: Name,
    args: Table[Name]['args'],
    options: RunOptions = {},
  ): Promise<Table[Name]['value']> {
    const { signal, transfer, bytes, threads, seed } = options;
    if (death !== null) return Promise.reject(deathError(death));
    if (signal?.aborted) return Promise.reject(abortedError());
    return new Promise((resolve, reject) => {
      const id = nextId++;
      let grace: ReturnType<typeof setTimeout> | undefined;

      /** True for the first to settle the call; whoever comes later is ignored. */
      function settle(): boolean {
        if (!pending.delete(id)) return false;
        signal?.removeEventListener('abort', abort);
        if (pending.size === 0) handle.hold(false);
        return true;
      }
      function fail(error: unknown): void {
        if (settle()) reject(error);
      }
      function abort(): void {
        handle.endpoint.postMessage({ wakeloom: 'abort', call: id } satisfies AbortMessage);
        grace = setTimeout(() => {
          fail(abortedError());
          if (death === null) void handle.terminate();
        }, graceMs);
        // A held worker keeps a Node process up; this clock alone shall not.
        (grace as { unref?: () => void }).unref?.();
        if (pending.get(id)?.begun === false) fail(abortedError());
      }

      pending.set(id, { begun: false, reject: fail, options });
      handle.hold(true);
      signal?.addEventListener('abort', abort);
      const call: Call = { id, operation, args, limits: { bytes, threads, seed } };
      send(remote, call, transfer).then(
        (outcome) => {
          clearTimeout(grace);
          if (!outcome.ok) fail(fromPlainError(outcome.error));
          else if (settle()) resolve(outcome.value as Table[Name]['value']);
        },
        (error) => {
          clearTimeout(grace);
          fail(notSerialisable(handle.name, operation, error));
        },
      );
    });
  }

  return {
    name: handle.name,
    get pending() {
      return pending.size;
    },
    get death() {
      return death;
    },
    run,
    onDeath: handle.onDeath,
    terminate: () => handle.terminate(),
  };
}

/** Sends a call; the list of what moves belongs to the whole message, comlink looks it up by the object sent. */
function send(remote: Remote<RemoteHost>, call: Call, transfer: readonly ArrayBuffer[] | undefined): Promise<Outcome> {
  return remote.call(transfer === undefined ? call : withTransfer(call, [...transfer]));
}

/** A fresh error a caller, so that each carries its own stack. */
function deathError(death: Death): WakeloomError {
  return new WakeloomError(death.code, death.message, death.details);
}

/** comlink rejects by itself only where arguments or value cannot be cloned or transferred. */
function notSerialisable(worker: string, operation: string, error: unknown): WakeloomError {
  const found = error instanceof Error ? error.message : String(error);
  return new WakeloomError(
    'worker/not-serialisable',
    `call of "${operation}" in worker "${worker}": got a value that cannot be sent (${found}), expected plain data and buffers that still hold their bytes`,
    { worker, operation, error: found },
    error,
  );
}
