// Writes what is generated from the table of settings: data/run-sheet.schema.json, and the table in README.md
// between its markers. With --check nothing is written and a stale file ends with exit code 1. Runs on the built
// library: `npm run compile` first.
import { existsSync, mkdirSync, readFileSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath, pathToFileURL } from 'node:url';

const root = join(dirname(fileURLToPath(import.meta.url)), '..');
const BEGIN = '<!-- settings:begin -->';
const END = '<!-- settings:end -->';

/** The built module, or a plain word where the library is not built. */
async function built(name) {
  const path = join(root, 'packages/tracker/dist', name);
  if (!existsSync(path)) {
    console.error('generate: got no built library, expected packages/tracker/dist; run "npm run compile" first');
    process.exit(1);
  }
  return import(pathToFileURL(path).href);
}

/** The text with what stands between the markers replaced; unchanged where they are missing. */
function between(text, content) {
  const begin = text.indexOf(BEGIN);
  const end = text.indexOf(END);
  if (begin < 0 || end < begin) return text;
  return `${text.slice(0, begin + BEGIN.length)}\n\n${content}\n${text.slice(end)}`;
}

const { runSheetJsonSchema } = await built('run/json-schema.js');
const { settingsMarkdown } = await built('run/settings-table.js');

const outputs = [['data/run-sheet.schema.json', () => `${JSON.stringify(runSheetJsonSchema(), null, 2)}\n`]];
if (existsSync(join(root, 'README.md'))) outputs.push(['README.md', (old) => between(old, settingsMarkdown())]);

const check = process.argv.includes('--check');
let stale = 0;
for (const [name, make] of outputs) {
  const path = join(root, name);
  const old = existsSync(path) ? readFileSync(path, 'utf8').replace(/\r\n/g, '\n') : '';
  const now = make(old);
  if (now === old) continue;
  stale++;
  if (check) {
    console.error(`${name}: got a stale file, expected what the table of settings gives; run "npm run generate"`);
  } else {
    mkdirSync(dirname(path), { recursive: true });
    writeFileSync(path, now);
    console.log(`${name} written`);
  }
}
if (check && stale > 0) process.exitCode = 1;
