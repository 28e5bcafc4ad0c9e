// Links dumps with known truth and scores the links: see HELP in options.mjs. One line a case, then the links by their
// stated risk; with --record the figures go to bench/results and the tables are made anew.
import { mkdirSync, rmSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { changed, commit, machine } from '../lib/provenance.mjs';
import { bundleHarness, ROOT, SCRATCH } from './bundle.mjs';
import { chosenCases, FIELDS, HELP, readOptions } from './options.mjs';
import { riskLines, scoreLine, speedLine } from './print.mjs';
import { RESULTS, writeTables } from './record.mjs';
import { runCases } from './run-cases.mjs';
import { prune } from './scratch.mjs';

try {
  const values = readOptions(process.argv.slice(2));
  if (values.help) console.log(HELP);
  else if (values.tables) writeTables();
  else await main(values);
} catch (error) {
  console.error(error instanceof Error ? error.message : error);
  process.exitCode = 2;
}

async function main(values) {
  const { folder, address } = await bundleHarness();
  try {
    const harness = await import(address);
    const record = await measure(values, chosenCases(values, harness), harness, address);
    if (values.out !== undefined) write(values.out, record);
    if (values.record) {
      const name = values.set === 'held-out' ? 'linking-held-out' : 'linking';
      write(join(RESULTS, `${name}-${record.date}-${record.commit}.json`), record);
      writeTables();
    }
    if (record.failed.length > 0) process.exitCode = 1;
  } finally {
    rmSync(folder, { recursive: true, force: true });
  }
}

async function measure(values, cases, harness, address) {
  const cache = values['no-cache'] ? null : join(SCRATCH, 'truth');
  if (cache !== null) prune(cache);
  // As it was when the sources were read: others may commit meanwhile.
  const begun = new Date().toISOString();
  const head = { begun, date: begun.slice(0, 10), commit: commit(), changed: changed(), machine: machine() };
  const started = performance.now();
  const pool = harness.emptyPool();
  const parts = new Map();
  const done = [];
  const failed = [];
  const told = new Set();
  await runCases(cases, {
    address,
    places: { root: ROOT, cache },
    workers: Number(values.workers ?? 2),
    onCase(index, { result, error }) {
      told.add(index);
      const name = harness.caseName(cases[index]);
      const place = `[${String(told.size).padStart(String(cases.length).length)}/${cases.length}]`;
      if (error !== undefined) {
        failed.push({ case: cases[index], error });
        console.log(`${place} ${name} FAILED: ${error}`);
        return;
      }
      harness.addPool(pool, result.risk);
      if (values['risk-by'] !== undefined) {
        const part = result.case[FIELDS[values['risk-by']]];
        if (!parts.has(part)) parts.set(part, harness.emptyPool());
        harness.addPool(parts.get(part), result.risk);
      }
      const one = {
        ...result,
        unusual: harness.unusual(result.case),
        bar: harness.barOf(result.case),
        risk: harness.summarise(result.risk),
      };
      done.push({ index, one });
      console.log(`${place} ${scoreLine(name, one)}`);
    },
  });
  for (const [index, one] of cases.entries()) {
    if (!told.has(index)) failed.push({ case: one, error: 'not begun: no worker process started' });
  }
  const risk = harness.judgeRisk(harness.summarise(pool));
  const record = {
    ...head,
    set: values.set ?? 'chosen',
    seconds: Math.round((performance.now() - started) / 1000),
    cases: done.sort((a, b) => a.index - b.index).map(({ one }) => one),
    failed,
    risk,
    flows: harness.FLOW_CASES.map(({ name, why }) => ({ name, why })),
  };
  for (const [part, of] of parts) {
    console.log(
      [`\n== ${values['risk-by']} ${part}`, ...riskLines(harness.judgeRisk(harness.summarise(of)))].join('\n'),
    );
  }
  if (done.length > 0) console.log([...riskLines(record.risk), speedLine(record)].join('\n'));
  if (failed.length > 0) console.log(`${failed.length} of ${cases.length} cases failed`);
  return record;
}

function write(file, record) {
  mkdirSync(dirname(file), { recursive: true });
  writeFileSync(file, `${JSON.stringify(record, null, 1)}\n`);
  console.log(`written to ${file}`);
}
