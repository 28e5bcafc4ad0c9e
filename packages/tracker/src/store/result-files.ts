import { WakeloomError } from '../core/errors.js';
import type { Hdf5Reader } from '../core/hdf5.js';
import type { ResultPlace } from '../core/result-place.js';
import { openHdf5Reader } from './hdf5-reader.js';
import { type RunRecord, SCHEMA_VERSION } from './run-record.js';

/** Where a finished result is read from: a result place, or files that come over HTTP. */
export interface ResultFiles {
  /** For messages. */
  readonly name: string;
  has(file: string): boolean;
  /** Throws `store/not-a-result` when the file is not there. */
  text(file: string): Promise<string>;
  hdf5(file: string): Promise<Hdf5Reader>;
}

/** The files of a place. */
export function placeFiles(place: ResultPlace): ResultFiles {
  return {
    name: place.name,
    has: (file) => place.size(file) >= 0,
    text: async (file) => place.readText(file),
    hdf5: async (file) => openHdf5Reader(await place.hdf5(), place.hdf5Path(file), `${place.name}/${file}`),
  };
}

function notAResult(where: string, found: string, cause?: unknown): WakeloomError {
  const message = `result folder: got ${found}, expected the folder of a finished run (${where}); process the run again`;
  return new WakeloomError('store/not-a-result', message, { path: where }, cause);
}

/**
 * The record in the text of a run.json. Figures that are not a number stand as null in JSON and come back as NaN.
 * Codes: `store/not-a-result`, `store/newer-schema`, `store/older-schema`.
 */
export function parseRunRecord(text: string, where: string): RunRecord {
  let parsed: unknown;
  try {
    parsed = JSON.parse(text);
  } catch (error) {
    throw notAResult(where, 'a run.json that is no JSON', error);
  }
  const record = parsed as RunRecord | null;
  const schema = typeof record === 'object' && record !== null ? /^(\d+)\.(\d+)$/.exec(String(record.schema)) : null;
  if (record === null || schema === null) throw notAResult(where, 'a run.json without a schema version');
  checkSchema(Number(schema[1]), Number(schema[2]), where);
  if (record.program?.name !== 'wakeloom' || typeof record.digest?.files !== 'object' || record.counts === undefined) {
    throw notAResult(where, 'a run.json with parts missing');
  }
  const figures = Object.fromEntries(
    Object.entries(record.figures ?? {}).map(([key, value]) => [key, value === null ? Number.NaN : value]),
  );
  return { ...record, figures: figures as unknown as RunRecord['figures'] };
}

function checkSchema(major: number, minor: number, where: string): void {
  const [ownMajor, ownMinor] = SCHEMA_VERSION.split('.').map(Number);
  const found = `${major}.${minor}`;
  if (major > ownMajor || (major === ownMajor && minor > ownMinor)) {
    const message = `result folder: got schema ${found}, expected at most ${SCHEMA_VERSION} (${where}); it was made by a newer version, open it with that one`;
    throw new WakeloomError('store/newer-schema', message, { path: where, found, expected: SCHEMA_VERSION });
  }
  if (major < ownMajor) {
    const message = `result folder: got schema ${found}, expected ${ownMajor}.x (${where}); process the run again with this version`;
    throw new WakeloomError('store/older-schema', message, { path: where, found, expected: SCHEMA_VERSION });
  }
}

/** The record of a result, its files looked for but not opened. Codes as parseRunRecord. */
export async function readRunRecord(files: ResultFiles): Promise<RunRecord> {
  const record = parseRunRecord(await files.text('run.json'), files.name);
  for (const file of Object.keys(record.digest.files)) {
    if (!files.has(file)) throw notAResult(files.name, `a run.json but no ${file}`);
  }
  return record;
}

/** Whether the folder holds a finished result that this version reads. Reads run.json only. */
export async function isCompleteResult(from: ResultPlace | ResultFiles): Promise<boolean> {
  try {
    await readRunRecord('hdf5Path' in from ? placeFiles(from) : from);
    return true;
  } catch (error) {
    const { code } = error as { code?: unknown };
    if (typeof code === 'string' && /^store\/(not-a-result|newer-schema|older-schema)$/.test(code)) return false;
    throw error;
  }
}
