import { type Endpoint, expose, transfer } from 'comlink';
import { createContext, type RunContext } from '../core/context.js';
import { toPlainError, WakeloomError } from '../core/errors.js';
import {
  type Call,
  isAbortMessage,
  type Notice,
  type OperationTable,
  type Outcome,
  type Returned,
} from './protocol.js';

/** Body of every operation of a table. `Platform` is what the entry hands to all of them: files, hashes, HDF5. */
export type OperationBodies<Table extends OperationTable, Platform> = {
  readonly [Name in keyof Table]: (
    args: Table[Name]['args'],
    context: RunContext,
    platform: Platform,
  ) => Promise<Returned<Table[Name]['value']>> | Returned<Table[Name]['value']>;
};

/** Shortest time between two progress messages of one stage, ms: ten a second are enough for a person. */
const PROGRESS_INTERVAL_MS = 100;

/**
 * The worker's side of the border: answers calls with the bodies given, forwards progress and events, and
 * fires the signal of a call whose abort arrives. Errors leave as `PlainError`. Call it once, synchronously
 * while the worker's script first runs, since a browser may drop messages that come before a listener.
 */
export function serveOperations<Table extends OperationTable, Platform>(
  bodies: OperationBodies<Table, Platform>,
  platform: Platform,
  endpoint: Endpoint,
): void {
  const running = new Map<number, AbortController>();

  endpoint.addEventListener('message', (event) => {
    const data = (event as MessageEvent<unknown>).data;
    if (isAbortMessage(data)) running.get(data.call)?.abort();
  });

  async function call(request: Call): Promise<Outcome> {
    const controller = new AbortController();
    running.set(request.id, controller);
    endpoint.postMessage({ wakeloom: 'begun', call: request.id } satisfies Notice);
    try {
      if (!Object.hasOwn(bodies, request.operation)) {
        throw new WakeloomError(
          'worker/unknown-operation',
          `worker call: got "${request.operation}", expected a known operation`,
          {
            operation: request.operation,
          },
        );
      }
      const body = bodies[request.operation] as OperationBodies<Table, Platform>[keyof Table];
      const context = createContext({
        ...request.limits,
        signal: controller.signal,
        onProgress: throttledProgress((notice) => endpoint.postMessage(notice), request.id),
        onEvent: (event) => endpoint.postMessage({ wakeloom: 'event', call: request.id, event } satisfies Notice),
      });
      const returned = await body(request.args, context, platform);
      const outcome: Outcome = { ok: true, value: returned.value };
      return transfer(outcome, [...returned.transfer]);
    } catch (error) {
      return { ok: false, error: toPlainError(asOutOfMemory(error)) };
    } finally {
      running.delete(request.id);
    }
  }

  expose({ call }, endpoint);
}

/** First and last report of a stage at once, those between at most every PROGRESS_INTERVAL_MS. */
function throttledProgress(post: (notice: Notice) => void, call: number): RunContext['progress'] {
  let lastStage = '';
  let lastTime = Number.NEGATIVE_INFINITY;
  return (stage, done, total, unit) => {
    const time = performance.now();
    if (stage === lastStage && done !== total && time - lastTime < PROGRESS_INTERVAL_MS) return;
    lastStage = stage;
    lastTime = time;
    post({ wakeloom: 'progress', call, stage, done, total, unit });
  };
}

/**
 * What engines say of an array they could not allocate (V8, SpiderMonkey, WebKit). A typed array of 2^30 or more
 * elements that V8 calls invalid is one too long for it; a short or negative length would be a mistake of ours.
 */
const NO_ROOM = /allocation (failed|size overflow)|out of memory|invalid typed array length: \d{10,}/i;

/** Lack of memory for an array as a coded error; the worker lives on. Other errors as they are. */
function asOutOfMemory(error: unknown): unknown {
  const text = error instanceof RangeError ? error.message : '';
  if (!NO_ROOM.test(text)) return error;
  return new WakeloomError(
    'worker/out-of-memory',
    `memory of a worker: got none for an array (${text}), expected room; use larger bins, a lower --ram-limit or a computer with more memory`,
    { error: text },
    error,
  );
}
