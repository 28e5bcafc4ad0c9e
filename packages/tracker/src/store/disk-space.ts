import { WakeloomError } from '../core/errors.js';
import type { ResultPlace } from '../core/result-place.js';

/** Room kept beyond the bytes asked for: file-system bookkeeping and HDF5 headers. One MiB, our choice. */
const MARGIN = 1 << 20;

function megabytes(bytes: number): string {
  return `${(bytes / 1e6).toFixed(bytes < 1e7 ? 2 : 0)} MB`;
}

/** The error for a disk that is, or is about to be, full. Code `store/disk-full`. */
export function diskFull(path: string, need: number, free: number | null, cause?: unknown): WakeloomError {
  const got = free === null ? 'no more room' : `${megabytes(free)} free`;
  return new WakeloomError(
    'store/disk-full',
    `disk full: got ${got}, expected at least ${megabytes(need)} (${path}); make room there or choose another folder, then run again`,
    { path, needBytes: need, freeBytes: free },
    cause,
  );
}

/**
 * Throws `store/disk-full` unless `need` bytes and a margin are free. HDF5 swallows failed writes, so this is
 * asked before every block. Costs one system call.
 */
export function checkRoom(place: ResultPlace, need: number): void {
  const free = place.freeBytes();
  if (free !== null && free < need + MARGIN) throw diskFull(place.name, need + MARGIN, free);
}
