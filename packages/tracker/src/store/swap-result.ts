import { isWakeloomError, WakeloomError } from '../core/errors.js';
import { PARTIAL_PREFIX, type ResultPlace } from '../core/result-place.js';

/** Files of a result folder in the order they are made. */
export const RESULT_FILES = ['pathlines.nc', 'frames.nc', 'grid.nc', 'report.html', 'log.ndjson', 'run.json'] as const;

/** Removes what a run left under partial names. */
export function clearPartials(place: ResultPlace): void {
  for (const file of place.files()) if (file.startsWith(PARTIAL_PREFIX)) place.remove(file);
}

/** Removes a result and whatever is left of one, run.json first: from then on the folder is no result. */
export function clearResult(place: ResultPlace): void {
  place.remove('run.json');
  for (const file of RESULT_FILES) place.remove(file);
  clearPartials(place);
}

/**
 * Gives `files`, which lie whole and synced under their partial names with run.json among them, their own names.
 * run.json of an earlier result goes first and the new one comes last, so that a folder with a run.json is whole at
 * every instant: an end in between leaves a folder that is no result. Nothing is written here, only names change, so
 * that the time in between is a few milliseconds.
 */
export function swapIn(place: ResultPlace, files: readonly string[]): void {
  place.remove('run.json');
  for (const file of RESULT_FILES) {
    if (file === 'run.json') continue;
    if (files.includes(file)) place.rename(PARTIAL_PREFIX + file, file);
    else place.remove(file);
  }
  place.rename(`${PARTIAL_PREFIX}run.json`, 'run.json');
}

/** Bytes of the result that the folder holds; 0 without a run.json. */
export function earlierBytes(place: ResultPlace): number {
  if (place.size('run.json') < 0) return 0;
  return RESULT_FILES.reduce((sum, file) => sum + Math.max(0, place.size(file)), 0);
}

/** A full disk, with the way out that an earlier result in the folder opens; any other error as it is. */
export function withEarlierResult(error: unknown, place: ResultPlace): unknown {
  if (!isWakeloomError(error) || error.code !== 'store/disk-full') return error;
  const earlierResultBytes = earlierBytes(place);
  if (earlierResultBytes === 0) return error;
  const megabytes = (earlierResultBytes / 1e6).toFixed(1);
  const message = `${error.message}; the earlier result in the folder takes ${megabytes} MB and stays until the new one is whole: remove it if you can do without`;
  return new WakeloomError(error.code, message, { ...error.details, earlierResultBytes }, error);
}
