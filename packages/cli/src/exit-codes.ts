import { isWakeloomError } from '@wakeloom/tracker/core/errors';

/** What the command ends with. */
export const EXIT = {
  /** All done. */
  done: 0,
  /** The work failed: bad data, a full disk, a crash. */
  failed: 1,
  /** Wrong usage or a wrong run sheet, columns that the dump does not have among them: nothing was written. */
  usage: 2,
  /** Stopped by the user. */
  interrupted: 130,
} as const;

/** What the first look into the dump tells about options and sheet rather than about the data. */
const COLUMNS = /^dump\/(no-such-column|columns-unclear|no-pathline-column)$/;

/** Exit code for a thrown value, by its code. */
export function exitCodeOf(error: unknown): number {
  if (!isWakeloomError(error)) return EXIT.failed;
  if (error.code === 'run/aborted') return EXIT.interrupted;
  return /^(usage|sheet)\//.test(error.code) || COLUMNS.test(error.code) ? EXIT.usage : EXIT.failed;
}
