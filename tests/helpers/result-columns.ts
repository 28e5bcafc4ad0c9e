import { createContext } from '@wakeloom/tracker';
import { openNodeResultPlace } from '@wakeloom/tracker/node';
import { folderDigest } from '@wakeloom/tracker/store/digest';
import { readBackDigest } from '@wakeloom/tracker/store/read-back';
import { isCompleteResult, openResult } from '@wakeloom/tracker/store/read-result';
import type { RunRecord } from '@wakeloom/tracker/store/run-record';

/** What pathlines.nc of a result folder holds: the number of its pathline and the columns of every sample. */
export interface ResultColumns {
  readonly record: RunRecord;
  readonly samples: number;
  readonly pathline: Int32Array;
  readonly column: Readonly<Record<string, Float64Array>>;
}

export async function readResult(folder: string): Promise<ResultColumns> {
  const result = await openResult(await openNodeResultPlace(folder, { create: false }));
  try {
    const { pathlines } = result;
    if (pathlines === null) throw new Error(`${folder}: no pathlines were kept`);
    const pathline = new Int32Array(pathlines.samples);
    for (let p = 0; p < pathlines.number.length; p++) {
      pathline.fill(pathlines.number[p], pathlines.firstRow[p], pathlines.firstRow[p + 1]);
    }
    const column = Object.fromEntries(
      pathlines.variables.map((name) => [name, Float64Array.from(pathlines.rows(name, 0, pathlines.samples), Number)]),
    );
    return { record: result.record, samples: pathlines.samples, pathline, column };
  } finally {
    result.close();
  }
}

/**
 * How a folder stands to its own record: `none` when it is no result; `sound` when every byte of its files is what
 * run.json says; else `broken`, what must never be.
 */
export async function stateOfFolder(folder: string): Promise<'none' | 'sound' | 'broken'> {
  const place = await openNodeResultPlace(folder, { create: false });
  if (!(await isCompleteResult(place))) return 'none';
  const { digest } = JSON.parse(place.readText('run.json')) as RunRecord;
  const found: Record<string, string> = {};
  for (const file of Object.keys(digest.files)) found[file] = await readBackDigest(place, file, createContext());
  return folderDigest(place.hasher, found) === digest.content && sameRecord(found, digest.files) ? 'sound' : 'broken';
}

function sameRecord(a: Readonly<Record<string, string>>, b: Readonly<Record<string, string>>): boolean {
  return JSON.stringify(Object.entries(a).sort()) === JSON.stringify(Object.entries(b).sort());
}
