import { createReadStream, readFileSync } from 'node:fs';
import { basename, join } from 'node:path';
import { nodeHasher } from '@wakeloom/tracker/node';
import type { ResolvedRun } from '@wakeloom/tracker/run/settings';
import type { RunRecord } from '@wakeloom/tracker/store/run-record';
import { lookAt } from './files.js';

/** Settings that change how the work is done but not what comes out, and the files, which are compared as such. */
const WITHOUT_EFFECT = new Set(['results.threads', 'results.ram-limit', 'dump.files']);

/** What we read of an earlier run.json: any version of ours, so nothing is taken for granted. */
export type EarlierRecord = Partial<Pick<RunRecord, 'run' | 'settings' | 'inputs'>>;

/** The run.json in a folder when it is one of ours, else null. */
export function earlierRecord(folder: string): EarlierRecord | null {
  try {
    const record = JSON.parse(readFileSync(join(folder, 'run.json'), 'utf8')) as EarlierRecord & {
      program?: { name?: unknown };
    };
    return record.program?.name === 'wakeloom' ? record : null;
  } catch {
    // No run.json, or not JSON: then it is no result of ours.
    return null;
  }
}

/**
 * In what a run differs from the earlier one: `other detections`, or keys of settings; empty when it is the same run
 * again. A file counts as the same when name, size and time are, or else its SHA-256 (then it is read once).
 */
export async function differencesFrom(
  earlier: EarlierRecord,
  run: ResolvedRun,
  files: readonly string[],
): Promise<string[]> {
  const before = written(earlier.settings ?? []);
  const now = written(run.records);
  const keys = [...new Set([...before.keys(), ...now.keys()])].filter((key) => !WITHOUT_EFFECT.has(key));
  // A setting that the earlier version did not have yet is no difference while nobody gives it.
  const untouched = new Set(run.records.filter(({ origin }) => origin === 'default').map(({ key }) => key));
  const changed = keys.filter((key) => before.get(key) !== now.get(key) && (before.has(key) || !untouched.has(key)));
  return (await sameFiles(earlier.inputs ?? [], files)) ? changed : ['other detections', ...changed];
}

/** Each setting's value and unit as text, by its key. */
function written(settings: RunRecord['settings']): Map<string, string> {
  return new Map(settings.map(({ key, value, unit }) => [key, JSON.stringify([value, unit])]));
}

async function sameFiles(inputs: RunRecord['inputs'], files: readonly string[]): Promise<boolean> {
  if (inputs.length !== files.length) return false;
  for (const [i, file] of files.entries()) {
    const { name, bytes, modified, sha256 } = inputs[i]!;
    const found = lookAt(file);
    if (found === undefined || found.size !== bytes || basename(file) !== basename(name)) return false;
    if (found.mtime.toISOString() !== modified && (await hashOf(file)) !== sha256) return false;
  }
  return true;
}

async function hashOf(file: string): Promise<string> {
  const hash = nodeHasher();
  for await (const bytes of createReadStream(file)) hash.update(bytes as Uint8Array);
  return hash.hex();
}
