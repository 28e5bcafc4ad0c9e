import type { ErrorDetails, PlainError } from '../core/errors.js';

/**
 * What crosses a worker border, as types only, so that any thread may import it. Calls and their results
 * travel over comlink; aborts, progress and events are plain messages on the same channel (comlink passes
 * over what carries no id or kind of its own), so that they keep their order relative to the result.
 */

/** Arguments and result of one operation; both must survive the structured clone. */
export interface Operation {
  readonly args: unknown;
  readonly value: unknown;
}

/** Operation names with their signatures. Write tables as `type`, not `interface`, so that they fit this. */
export type OperationTable = { readonly [name: string]: Operation };

/** Name of an operation of a table. */
export type OperationName<Table extends OperationTable> = keyof Table & string;

/** What every operation returns: its result, and the buffers in it that move instead of being copied (see transfer.ts). */
export interface Returned<Value> {
  readonly value: Value;
  readonly transfer: readonly ArrayBuffer[];
}

/** One call as it is sent. `id` is unique within one client. */
export interface Call {
  readonly id: number;
  readonly operation: string;
  readonly args: unknown;
  /** For the worker's RunContext: working memory in bytes, threads beside it, the run's seed; absent: its defaults. */
  readonly limits: CallLimits;
}

/** See `ContextOptions` in core/context.ts. */
export interface CallLimits {
  readonly bytes?: number;
  readonly threads?: number;
  readonly seed?: number;
}

/** Result of a call: comlink would keep only name, message and stack of an error, so that ours travels as a value. */
export type Outcome =
  | { readonly ok: true; readonly value: unknown }
  | { readonly ok: false; readonly error: PlainError };

/** The object a worker exposes through comlink. */
export interface RemoteHost {
  call(call: Call): Promise<Outcome>;
}

/** Caller to worker, outside comlink: let the call reject with `run/aborted` at its next breath. */
export interface AbortMessage {
  readonly wakeloom: 'abort';
  readonly call: number;
}

/**
 * Worker to caller, outside comlink. `begun` comes first of each call: before it the worker may still be loading its
 * script. Progress is throttled in the worker, events are not.
 */
export type Notice =
  | { readonly wakeloom: 'begun'; readonly call: number }
  | {
      readonly wakeloom: 'progress';
      readonly call: number;
      readonly stage: string;
      readonly done: number;
      readonly total: number | null;
      readonly unit: string;
    }
  | {
      readonly wakeloom: 'event';
      readonly call: number;
      readonly event: {
        readonly code: string;
        readonly level: 'info' | 'note' | 'warning';
        readonly message: string;
        readonly details: Readonly<Record<string, unknown>>;
      };
    };

/** True for a notice of a worker, false for comlink's own messages. */
export function isNotice(data: unknown): data is Notice {
  const kind = (data as { wakeloom?: unknown } | null)?.wakeloom;
  return kind === 'begun' || kind === 'progress' || kind === 'event';
}

/** True for an abort message, false for comlink's own messages. */
export function isAbortMessage(data: unknown): data is AbortMessage {
  return (data as { wakeloom?: unknown } | null)?.wakeloom === 'abort';
}

/** Why a worker can answer no more. */
export interface Death {
  readonly code: 'worker/crashed' | 'worker/exited' | 'worker/out-of-memory' | 'worker/unreadable-message';
  readonly message: string;
  readonly details: ErrorDetails;
}
