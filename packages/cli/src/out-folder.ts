import { mkdirSync, readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { WakeloomError } from '@wakeloom/tracker/core/errors';
import { lookAt } from './files.js';

/** Files a result folder consists of, finished or cut short. */
const OURS = /^(run\.json|pathlines\.nc|frames\.nc|grid\.nc|log\.ndjson|report\.html|\.partial-.*)$/;
/** What operating systems leave behind in any folder. */
const IGNORED = /^(\.DS_Store|Thumbs\.db|desktop\.ini)$/;

/**
 * Makes the result folder and sees that it can be written, before any work. A folder that holds something other than
 * an earlier result of ours is refused unless `replace`; nothing foreign is ever removed. Codes:
 * `usage/out-not-a-folder`, `usage/out-not-empty`, `usage/out-not-writable`.
 */
export function prepareOutFolder(folder: string, replace: boolean): void {
  const found = lookAt(folder);
  if (found !== undefined && !found.isDirectory()) {
    throw new WakeloomError('usage/out-not-a-folder', `--out: got "${folder}", which is a file, expected a folder`, {
      path: folder,
    });
  }
  if (found !== undefined && !replace) refuseForeign(folder);
  try {
    mkdirSync(folder, { recursive: true });
    const probe = join(folder, '.partial-probe');
    writeFileSync(probe, 'probe');
    rmSync(probe);
  } catch (error) {
    const reason = (error as NodeJS.ErrnoException).code ?? String(error);
    throw new WakeloomError(
      'usage/out-not-writable',
      `--out: got "${folder}", which cannot be written (${reason}), expected a folder with room and permission to write`,
      { path: folder, reason },
      error,
    );
  }
}

function refuseForeign(folder: string): void {
  const entries = readdirSync(folder).filter((name) => !IGNORED.test(name));
  if (entries.length === 0 || isOurResult(folder)) return;
  const foreign = entries.filter((name) => !OURS.test(name));
  // Only our own files without run.json: a run that was cut short, which a new one may replace.
  if (foreign.length === 0) return;
  throw new WakeloomError(
    'usage/out-not-empty',
    `--out: got "${folder}", which holds other files (${foreign.sort().slice(0, 3).join(', ')}${foreign.length > 3 ? ', ...' : ''}), expected an empty or new folder, or an earlier result; choose another one, or add --replace to write beside them`,
    { path: folder, files: foreign.length },
  );
}

/** True when the folder holds a run.json that we wrote. */
export function isOurResult(folder: string): boolean {
  try {
    const record = JSON.parse(readFileSync(join(folder, 'run.json'), 'utf8')) as { program?: { name?: unknown } };
    return record.program?.name === 'wakeloom';
  } catch {
    // No run.json, or not JSON: then it is no result of ours.
    return false;
  }
}
