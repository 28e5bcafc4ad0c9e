import { mkdirSync, readdirSync, rmdirSync, rmSync, writeFileSync } from 'node:fs';
import { dirname, join, resolve } from 'node:path';
import { WakeloomError } from '@wakeloom/tracker/core/errors';
import { type EarlierRecord, earlierRecord } from './earlier-result.js';
import { lookAt } from './files.js';

/** Files a result folder consists of, finished or cut short. */
const OURS = /^(run\.json|pathlines\.nc|frames\.nc|grid\.nc|log\.ndjson|report\.html|\.partial-.*)$/;
/** What operating systems leave behind in any folder. */
const IGNORED = /^(\.DS_Store|Thumbs\.db|desktop\.ini)$/;

/** What was found at, and done to, the place of the result before the work. */
export interface OutFolder {
  /** Record of the complete result that the new one will take the place of, or null. */
  readonly earlier: EarlierRecord | null;
  /** Removes the folders that were made, where they are still empty: for a run that came to nothing. */
  undo(): void;
}

/**
 * Makes the result folder and sees that it can be written, before any work. A folder that holds something other than
 * an earlier result of ours is refused unless `replace`, and so is the result of another run; nothing foreign is ever
 * removed. Codes: `usage/out-not-a-folder`, `usage/out-not-empty`, `usage/out-other-run`, `usage/out-not-writable`.
 * @param differences in what the new run differs from the earlier one
 */
export async function prepareOutFolder(
  folder: string,
  replace: boolean,
  differences: (earlier: EarlierRecord) => Promise<readonly string[]>,
): Promise<OutFolder> {
  const found = lookAt(folder);
  if (found !== undefined && !found.isDirectory()) {
    throw new WakeloomError('usage/out-not-a-folder', `--out: got "${folder}", which is a file, expected a folder`, {
      path: folder,
    });
  }
  const earlier = earlierRecord(folder);
  if (!replace && earlier !== null) refuseOtherRun(folder, earlier, await differences(earlier));
  if (!replace && earlier === null && found !== undefined) refuseForeign(folder);
  let made: string | undefined;
  try {
    made = mkdirSync(folder, { recursive: true });
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
  return { earlier, undo: () => removeEmpty(resolve(folder), made) };
}

/** Removes `folder` and its parents up to `top`, the first that was made, as long as they are empty. */
function removeEmpty(folder: string, top: string | undefined): void {
  if (top === undefined) return;
  try {
    rmdirSync(folder);
  } catch {
    // Not empty: something came in meanwhile, which stays.
    return;
  }
  if (folder !== resolve(top)) removeEmpty(dirname(folder), top);
}

function refuseOtherRun(folder: string, earlier: EarlierRecord, differences: readonly string[]): void {
  if (differences.length === 0) return;
  const named = differences.slice(0, 4).join(', ') + (differences.length > 4 ? ', ...' : '');
  throw new WakeloomError(
    'usage/out-other-run',
    `--out: got "${folder}", which holds the result of another run, "${earlier.run ?? '?'}" (differs in ${named}), expected a new folder, or the same detections and settings; choose another one, or add --replace to put the new result in its place`,
    { path: folder, differences },
  );
}

function refuseForeign(folder: string): void {
  const entries = readdirSync(folder).filter((name) => !IGNORED.test(name));
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
  return earlierRecord(folder) !== null;
}
