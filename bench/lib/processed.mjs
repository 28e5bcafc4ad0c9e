import { readFileSync, rmSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import { runWatched } from './run-watched.mjs';
import { check } from './timed.mjs';

const command = fileURLToPath(new URL('../../packages/cli/bin/wakeloom.mjs', import.meta.url));

/** Processes a made CSV through the command into `out`; the record, what it took, and that all rows were read. */
export async function processed(csv, out, rows, ...options) {
  rmSync(out, { recursive: true, force: true });
  const words = ['process', csv, '--rate', '100 Hz', '--scale', '0.05 mm/px', '--out', out, '--quiet', ...options];
  const watched = await runWatched([command, ...words]);
  check(watched.code === 0, `exit ${watched.code}: ${watched.said}`);
  const record = JSON.parse(readFileSync(`${out}/run.json`, 'utf8'));
  check(record.counts.rowsRead === rows, `${record.counts.rowsRead} rows read, expected ${rows}`);
  check(record.counts.samples > 0.9 * rows, `${record.counts.samples} samples of ${rows} rows`);
  return { ...watched, record };
}

/** `scan 0.7 s, look 1.9 s, ...` of a record. */
export function stagesOf(record) {
  const parts = Object.entries(record.clockTimes.seconds).filter(([, value]) => value > 0.05);
  return parts.map(([stage, value]) => `${stage} ${value.toFixed(1)} s`).join(', ');
}
