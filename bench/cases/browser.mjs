/**
 * One million detections through linking and kinematics in a worker of a page (headless Chromium) and in a worker thread of
 * Node, the same dump and the same settings, in turns. Both must leave the same pathlines, to the digest. What is timed is
 * the first look and the stream of the run (reading, linking, fits, screening, spill), as the run's own clock has them; the
 * page spills to memory, Node to the disk. The bar: 0.7 of Node's speed. Wants Debian's chromium.
 */
import { createReadStream, mkdirSync, rmSync, statSync } from 'node:fs';
import { readFile } from 'node:fs/promises';
import { createServer } from 'node:http';
import { fileURLToPath } from 'node:url';
import { processInWorker } from '@wakeloom/tracker/node';
import { resolveRun } from '@wakeloom/tracker/run/resolve';
import { chromium } from 'playwright-core';
import { build, defaultClientConditions } from 'vite';
import { writeMadeCsv } from '../lib/made-csv.mjs';
import { check, print, rate } from '../lib/timed.mjs';

const FRAMES = 100;
const PER_FRAME = 10_000;
const ROWS = FRAMES * PER_FRAME;
const RUNS = 5;
const BAR = 0.7;
const TYPES = { html: 'text/html; charset=utf-8', js: 'text/javascript; charset=utf-8' };

const folder = fileURLToPath(new URL('../scratch/browser/', import.meta.url));
const csv = `${folder}made.csv`;

/** Serves the built page and the dump on 127.0.0.1. */
async function serve() {
  const server = createServer(async (request, response) => {
    const path = new URL(request.url, 'http://x').pathname;
    if (path === '/made.csv') {
      response.setHeader('content-length', statSync(csv).size);
      createReadStream(csv).pipe(response);
      return;
    }
    const name = path === '/' ? 'index.html' : path.slice(1);
    try {
      const bytes = await readFile(`${folder}page/${name}`);
      response.setHeader('content-type', TYPES[name.split('.').at(-1)] ?? 'application/octet-stream');
      response.end(bytes);
    } catch {
      response.writeHead(404).end();
    }
  });
  await new Promise((resolve) => server.listen(0, '127.0.0.1', resolve));
  return { origin: `http://127.0.0.1:${server.address().port}`, close: () => server.close() };
}

function row(name, records, note) {
  const seconds = records.map(timeOf).sort((a, b) => a - b);
  const medianSeconds = seconds[RUNS >> 1];
  const total = records.map((record) => record.clockTimes.seconds.total).sort((a, b) => a - b)[RUNS >> 1];
  return {
    name,
    medianSeconds,
    spread: (seconds[RUNS - 1] - seconds[0]) / medianSeconds,
    rate: rate(ROWS, medianSeconds, 'detections'),
    note: `${note}whole run ${total.toFixed(2)} s`,
  };
}

const timeOf = ({ clockTimes }) => clockTimes.seconds.look + clockTimes.seconds.stream;

export async function run() {
  rmSync(folder, { recursive: true, force: true });
  mkdirSync(folder, { recursive: true });
  writeMadeCsv(csv, { frames: FRAMES, perFrame: PER_FRAME, ratio: 0.3, seed: 11 });
  await build({
    root: fileURLToPath(new URL('../page', import.meta.url)),
    configFile: false,
    logLevel: 'error',
    base: './',
    resolve: { conditions: ['source', ...defaultClientConditions] },
    worker: { format: 'es' },
    build: { outDir: `${folder}page`, emptyOutDir: true, target: 'es2022' },
  });
  const server = await serve();
  // As tests/helpers/browser.ts starts it.
  const quiet = ['quic', 'background-networking', 'component-update', 'sync'].map((what) => `--disable-${what}`);
  const browser = await chromium.launch({
    executablePath: '/usr/bin/chromium',
    args: ['--no-sandbox', '--no-first-run', ...quiet],
  });
  try {
    const page = await browser.newPage();
    await page.goto(server.origin);
    await page.waitForFunction(() => 'processDump' in globalThis);
    const options = { rate: '100 Hz', scale: '0.05 mm/px', run: 'made' };
    const resolved = resolveRun({ options, dumpFiles: ['made.csv'] });
    const request = { resolved, programVersion: 'bench' };
    const inPage = () => page.evaluate((asked) => globalThis.processDump('/made.csv', asked), request);
    const { ramLimit } = resolved.settings.results;
    const inNode = () => processInWorker(request, [csv], `${folder}result`, { threads: 1, ramLimit });
    const warm = [await inPage(), await inNode()];
    const digests = warm.map(({ digest }) => digest.files['pathlines.nc']);
    check(digests[0] === digests[1], `pathlines of the page ${digests[0]}, of Node ${digests[1]}`);
    check(warm[0].counts.samples > 0.9 * ROWS, `${warm[0].counts.samples} samples`);
    const pages = [];
    const nodes = [];
    for (let k = 0; k < RUNS; k++) {
      pages.push(await inPage());
      nodes.push(await inNode());
    }
    const rows = [
      row('link and fit 1 million detections in headless Chromium', pages, 'same pathlines; '),
      row('link and fit 1 million detections in Node', nodes, ''),
    ];
    const share = rows[1].medianSeconds / rows[0].medianSeconds;
    rows[0].note = `${share.toFixed(2)} of Node's speed, ${share >= BAR ? 'within' : 'BAR MISSED:'} ${BAR}; ${rows[0].note}`;
    return rows;
  } finally {
    await browser.close();
    server.close();
    rmSync(folder, { recursive: true, force: true });
  }
}

if (process.argv[1] === fileURLToPath(import.meta.url)) print(await run());
