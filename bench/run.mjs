// Runs the benches (all, or those named: `npm run bench -- link grid`), after `npm run compile`. All of them: results go to
// bench/results/DATE-COMMIT.json and the table in bench/results/README.md is made anew from them. Each case checks
// its answers before it is timed and compares within one run: absolute figures of a shared machine drift.
import { mkdirSync, writeFileSync } from 'node:fs';
import { fileURLToPath, pathToFileURL } from 'node:url';
import { commit, machine } from './lib/provenance.mjs';
import { print } from './lib/timed.mjs';

const here = (path) => fileURLToPath(new URL(path, import.meta.url));
const CASES = ['read-csv', 'neighbours', 'link', 'fit', 'grid', 'store', 'browser', 'whole-run', 'whole-job-peers'];
/** Cases that are run when they are named only: they take long. */
const ALONE = ['hundred-million'];

/** The newest results by the date in their name, as text for README.md. */
export function table(file, { machine, cases }) {
  const cell = (text) => String(text).replaceAll('|', '\\|');
  const lines = Object.entries(cases).flatMap(([, rows]) =>
    rows.map((row) =>
      [
        row.name,
        `${row.medianSeconds.toFixed(3)} s`,
        row.spread === null ? 'once' : `${Math.round(100 * row.spread)} %`,
        row.rate,
        row.peakMegabytes === undefined ? '' : `${row.peakMegabytes} MB`,
        row.note ?? '',
      ]
        .map(cell)
        .join(' | '),
    ),
  );
  return `# Benches

Made from ${file} by \`npm run bench\`; do not edit. Time: median of several runs, or of one where it says so. Spread: largest
minus smallest over the median. Peak: resident memory of the whole process as the kernel notes it. Compare rows of one
table only.

${machine.processor}, ${machine.cores} cores, ${machine.memoryGigabytes} GB, ${machine.platform}, Node ${machine.node}; load before the run ${machine.loadBefore}.

| what | time | spread | rate | peak | notes |
|---|---|---|---|---|---|
${lines.map((line) => `| ${line} |`).join('\n')}
`;
}

async function main(named) {
  const known = [...CASES, ...ALONE];
  const unknown = named.filter((name) => !known.includes(name));
  if (unknown.length > 0) throw new Error(`no such bench: ${unknown.join(', ')}; there are ${known.join(', ')}`);
  const result = {
    date: new Date().toISOString().slice(0, 10),
    commit: commit(),
    machine: machine(),
    cases: {},
  };
  for (const name of named.length > 0 ? named : CASES) {
    console.log(`\n== ${name}`);
    const { run } = await import(pathToFileURL(here(`cases/${name}.mjs`)).href);
    result.cases[name] = await run();
    print(result.cases[name]);
  }
  if (named.length > 0) return;
  const file = `${result.date}-${result.commit}.json`;
  mkdirSync(here('results'), { recursive: true });
  writeFileSync(here(`results/${file}`), `${JSON.stringify(result, null, 2)}\n`);
  writeFileSync(here('results/README.md'), table(file, result));
  console.log(`\nwritten to bench/results/${file}`);
}

if (process.argv[1] === fileURLToPath(import.meta.url)) await main(process.argv.slice(2));
