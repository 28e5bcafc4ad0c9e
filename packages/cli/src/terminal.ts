import type { ByteSink } from '@wakeloom/tracker/core/bytes';
import { WakeloomError } from '@wakeloom/tracker/core/errors';
import picocolors from 'picocolors';

/** Where a command speaks. Results and data go to stdout; progress, warnings and errors to stderr. */
export interface Terminal {
  /** A whole line to stdout. */
  result(line: string): void;
  /** A whole line to stderr. */
  say(line: string): void;
  /** Raw text to stderr, for the progress line. */
  draw(text: string): void;
  /** Sink on stdout for exported data; waits while the reader is slow. */
  dataSink(): ByteSink;
  /** True when stderr is a terminal that can redraw a line. */
  readonly redraws: boolean;
  /** Columns of the terminal, 80 where unknown. */
  readonly columns: number;
  readonly paint: { bold(text: string): string; red(text: string): string; yellow(text: string): string };
  /** True when WAKELOOM_DEBUG=1: errors show their stack. */
  readonly debug: boolean;
}

/** The terminal of this process. Keeps NO_COLOR and TERM=dumb: no colours, no redrawn line. */
export function processTerminal(): Terminal {
  const { stdout, stderr, env } = process;
  const dumb = env['TERM'] === 'dumb';
  const noColour = env['NO_COLOR'] !== undefined && env['NO_COLOR'] !== '';
  const redraws = stderr.isTTY === true && !dumb;
  const colours = picocolors.createColors(redraws && !noColour);
  // Without a listener a closed pipe (`| head`) would end the process with a stack trace; writes report it anyway.
  stdout.on('error', () => {});
  stderr.on('error', () => {});
  return {
    result: (line) => void stdout.write(`${line}\n`),
    say: (line) => void stderr.write(`${line}\n`),
    draw: (text) => void stderr.write(text),
    dataSink: () => ({
      write: (bytes) =>
        new Promise((resolve, reject) => {
          stdout.write(bytes, (error) => (error ? reject(outputError(error)) : resolve()));
        }),
      close: () => Promise.resolve(),
    }),
    redraws,
    columns: stderr.columns ?? stdout.columns ?? 80,
    paint: colours,
    debug: env['WAKELOOM_DEBUG'] === '1',
  };
}

/** Thrown where whoever read standard output has gone: no failure of ours, the command just ends. */
export const READER_GONE = 'run/reader-gone';

function outputError(error: NodeJS.ErrnoException): WakeloomError {
  if (error.code === 'EPIPE') return new WakeloomError(READER_GONE, 'standard output was closed by its reader');
  const full = error.code === 'ENOSPC';
  return new WakeloomError(
    full ? 'store/disk-full' : 'store/not-writable',
    `standard output: got ${error.code ?? error.message}, expected ${full ? 'room on the disk' : 'to write'}`,
    {},
    error,
  );
}
