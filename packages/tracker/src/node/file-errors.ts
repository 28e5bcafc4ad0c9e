import { WakeloomError } from '../core/errors.js';

/** The system's code of a failed file call (`ENOSPC`), or null. */
export function systemCode(error: unknown): string | null {
  const code = (error as { code?: unknown } | null)?.code;
  return typeof code === 'string' && /^E[A-Z0-9]+$/.test(code) ? code : null;
}

/**
 * Coded error for a failed write: `store/disk-full` for a full disk or quota, `store/not-a-folder`, else
 * `store/not-writable`. Errors that already carry a code of ours pass through.
 */
export function writeError(error: unknown, path: string, need = 0): unknown {
  const code = systemCode(error);
  if (code === null) return error;
  if (code === 'ENOSPC' || code === 'EDQUOT') {
    const message = `disk full: got no room for ${need} bytes more, expected room for them (${path}); make room there or choose another folder, then run again`;
    return new WakeloomError('store/disk-full', message, { path, needBytes: need, freeBytes: 0 }, error);
  }
  if (code === 'ENOTDIR' || code === 'EEXIST') {
    const message = `result folder: got a file, expected a folder (${path}); choose another name`;
    return new WakeloomError('store/not-a-folder', message, { path }, error);
  }
  const message = `result folder: got ${code}, expected a folder that can be written (${path}); check that it exists and its permissions`;
  return new WakeloomError('store/not-writable', message, { path, system: code }, error);
}
