import { existsSync, readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { compactTable, fullTable } from './tables.mjs';

const ROOT = fileURLToPath(new URL('../..', import.meta.url));
/** Folder of results that are kept. */
export const RESULTS = join(ROOT, 'bench', 'results');
const BEGIN = '<!-- linking:begin -->';
const END = '<!-- linking:end -->';

/**
 * Makes bench/results/linking.md, and what stands between the markers of README.md, from the newest records. Where
 * README.md has no markers it is left alone.
 */
export function writeTables() {
  const full = newest(/^linking-\d{4}-.*\.json$/);
  if (full === null)
    throw new Error('bench/results: got no linking-DATE-COMMIT.json, expected one; run --set full --record');
  const heldOut = newest(/^linking-held-out-.*\.json$/);
  writeFileSync(join(RESULTS, 'linking.md'), fullTable(full, heldOut));
  console.log('bench/results/linking.md written');
  const path = join(ROOT, 'README.md');
  const old = readFileSync(path, 'utf8');
  const begin = old.indexOf(BEGIN);
  const end = old.indexOf(END);
  if (begin < 0 || end < begin) return console.log(`README.md: no ${BEGIN} .. ${END}, left alone`);
  const text = `${old.slice(0, begin + BEGIN.length)}\n\n${compactTable(full)}\n${old.slice(end)}`;
  if (text === old) return;
  writeFileSync(path, text);
  console.log('README.md written');
}

/** The record that was begun last among the files of that name; null where there is none. */
function newest(pattern) {
  if (!existsSync(RESULTS)) return null;
  const records = readdirSync(RESULTS)
    .filter((name) => pattern.test(name))
    .map((name) => ({ file: name, ...JSON.parse(readFileSync(join(RESULTS, name), 'utf8')) }));
  return records.sort((a, b) => (a.begun < b.begun ? 1 : -1))[0] ?? null;
}
