/**
 * The one error class of the library. Every failure that a person can act on is a `WakeloomError`
 * worded `what: got X, expected Y (where)`, so that the message alone says what to do.
 */

/** Area of the library that raised the error, then what went wrong: `dump/empty`, `store/disk-full`. */
export type ErrorCode = `${
  | 'usage'
  | 'sheet'
  | 'dump'
  | 'geometry'
  | 'linking'
  | 'kinematics'
  | 'grid'
  | 'store'
  | 'worker'
  | 'run'}/${string}`;

/** Facts behind a message, in plain JSON values, so that they survive a worker border and stand in a log. */
export type ErrorDetails = Readonly<Record<string, string | number | boolean | null | readonly (string | number)[]>>;

/** What travels over a worker border instead of the error object itself (see `workers/protocol.ts`). */
export interface PlainError {
  readonly code: ErrorCode;
  readonly message: string;
  readonly details: ErrorDetails;
  readonly stack?: string;
}

/** Coded error. Branch on `code`, never on `instanceof`: worker borders keep only plain values. */
export class WakeloomError extends Error {
  override readonly name = 'WakeloomError';
  readonly code: ErrorCode;
  readonly details: ErrorDetails;

  constructor(code: ErrorCode, message: string, details: ErrorDetails = {}, cause?: unknown) {
    super(message, cause === undefined ? undefined : { cause });
    this.code = code;
    this.details = details;
  }
}

/** True for any object that carries one of our codes, whichever thread made it. */
export function isWakeloomError(value: unknown): value is WakeloomError {
  return (
    typeof value === 'object' &&
    value !== null &&
    typeof (value as { code?: unknown }).code === 'string' &&
    (value as { code: string }).code.includes('/')
  );
}

/** Plain form of any thrown value; an unknown one gets the code `run/unexpected`. */
export function toPlainError(error: unknown): PlainError {
  if (isWakeloomError(error)) {
    return { code: error.code, message: error.message, details: error.details ?? {}, stack: error.stack };
  }
  const message = error instanceof Error ? error.message : String(error);
  return { code: 'run/unexpected', message, details: {}, stack: error instanceof Error ? error.stack : undefined };
}

/** The error object again on the other side of a worker border. */
export function fromPlainError(plain: PlainError): WakeloomError {
  const error = new WakeloomError(plain.code, plain.message, plain.details);
  if (plain.stack !== undefined) error.stack = plain.stack;
  return error;
}

/** Thrown by `RunContext.breathe` and by waiting calls when the caller's signal fires. Code `run/aborted`. */
export function abortedError(): WakeloomError {
  return new WakeloomError('run/aborted', 'the run was aborted on request; start it again to get a result');
}
