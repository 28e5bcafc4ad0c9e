import type { ProgressListener, RunEvent } from '@wakeloom/tracker/core/context';

/** Ears of the command on long work. */
export interface Hooks {
  readonly onProgress: ProgressListener;
  readonly onEvent: (event: RunEvent) => void;
  readonly signal: AbortSignal;
}
