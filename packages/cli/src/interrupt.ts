import { EXIT } from './exit-codes.js';

/**
 * Runs `work` with a signal that fires at the first Ctrl-C (SIGINT) or SIGTERM, so that it stops cleanly; the second
 * ends the process at once. The handlers live only as long as the work.
 */
export async function withInterrupt<T>(
  say: (line: string) => void,
  work: (signal: AbortSignal) => Promise<T>,
): Promise<T> {
  const controller = new AbortController();
  const stop = () => {
    if (controller.signal.aborted) process.exit(EXIT.interrupted);
    say('stopping; press Ctrl-C again to end at once');
    controller.abort();
  };
  process.on('SIGINT', stop);
  process.on('SIGTERM', stop);
  try {
    return await work(controller.signal);
  } finally {
    process.off('SIGINT', stop);
    process.off('SIGTERM', stop);
  }
}
