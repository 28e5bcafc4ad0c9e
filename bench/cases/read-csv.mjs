/**
 * Reading a CSV dump: our reader beside a loop that only counts newlines and beside papaparse, on one generated file.
 * The answers are checked before anything is timed. Run alone with `node bench/cases/read-csv.mjs` after `npm run
 * compile`, or through bench/run.mjs.
 */

import { createReadStream } from 'node:fs';
import { mkdir, open, rm } from 'node:fs/promises';
import { fileURLToPath } from 'node:url';
import { createContext } from '@wakeloom/tracker';
import { openDump } from '@wakeloom/tracker/detections/open-dump';
import { nodeHasher, openFileSource } from '@wakeloom/tracker/node';
import papaparse from 'papaparse';
import { uniformFloat64 } from 'pure-rand/distribution/uniformFloat64';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';

const FRAMES = 200;
const PER_FRAME = 10_000;
const RUNS = 5;

const SETTINGS = {
  files: ['read-csv'],
  format: 'auto',
  columns: { frame: 'auto', x: 'auto', y: 'auto', z: 'auto', brightness: 'auto', pathline: 'auto', time: 'auto' },
  separator: 'auto',
  decimal: 'auto',
  header: 'auto',
  layout: 'one-file-a-run',
  dataset: null,
  badRowsLimit: 0.01,
  given: 'ignore',
};

/** Writes the file; returns its length and sums that any reader must find again. */
async function generate(path, write) {
  const random = xoroshiro128plus(20240607);
  const sums = { rows: 0, x: 0, y: 0, brightness: 0 };
  let bytes = 0;
  const file = await open(path, 'w');
  for (let frame = 0; frame < FRAMES; frame++) {
    let text = frame === 0 ? 'frame,x,y,intensity\n' : '';
    for (let i = 0; i < PER_FRAME; i++) {
      const row = write(random);
      text += `${frame},${row[0]},${row[1]},${row[2]}\n`;
      sums.rows++;
      sums.x += Number(row[0]);
      sums.y += Number(row[1]);
      sums.brightness += Number(row[2]);
    }
    const encoded = Buffer.from(text);
    bytes += encoded.length;
    await file.write(encoded);
  }
  await file.close();
  return { sums, bytes };
}

async function ours(path, scanToo) {
  const source = await openFileSource(path);
  const dump = openDump([source], SETTINGS, { hasher: nodeHasher, hdf5: null, ramLimit: 2 ** 28 });
  const context = createContext();
  await dump.scan(context);
  const sums = { rows: 0, x: 0, y: 0, brightness: 0 };
  const start = performance.now();
  if (scanToo) sums.rows = (await dump.scan(context)).rowsRead;
  else {
    for await (const block of dump.blocks(context)) {
      sums.rows += block.x.length;
      for (let i = 0; i < block.x.length; i++) {
        sums.x += block.x[i];
        sums.y += block.y[i];
        sums.brightness += block.brightness[i];
      }
    }
  }
  const seconds = (performance.now() - start) / 1000;
  await source.close();
  return { seconds, sums };
}

async function newlines(path) {
  const source = await openFileSource(path);
  const buffer = new Uint8Array(1 << 20);
  let count = 0;
  const start = performance.now();
  for (let position = 0; position < source.size; ) {
    const got = await source.read(position, buffer);
    for (let i = 0; i < got; i++) if (buffer[i] === 10) count++;
    position += got;
  }
  const seconds = (performance.now() - start) / 1000;
  await source.close();
  return { seconds, sums: { rows: count - 1 } };
}

function withPapaparse(path) {
  return new Promise((resolve, reject) => {
    const sums = { rows: 0, x: 0, y: 0, brightness: 0 };
    const start = performance.now();
    let header = true;
    papaparse.parse(createReadStream(path, { highWaterMark: 1 << 20 }), {
      delimiter: ',',
      fastMode: true,
      chunk: ({ data }) => {
        for (const row of data) {
          if (header) {
            header = false;
            continue;
          }
          if (row.length < 4) continue;
          sums.rows++;
          sums.x += Number(row[1]);
          sums.y += Number(row[2]);
          sums.brightness += Number(row[3]);
        }
      },
      complete: () => resolve({ seconds: (performance.now() - start) / 1000, sums }),
      error: reject,
    });
  });
}

function check(name, sums, expected) {
  for (const [key, value] of Object.entries(sums)) {
    if (value !== expected[key]) throw new Error(`${name} reads ${key} = ${value}, expected ${expected[key]}`);
  }
}

async function time(name, bytes, expected, call) {
  check(name, (await call()).sums, expected);
  const seconds = [];
  for (let i = 0; i < RUNS; i++) seconds.push((await call()).seconds);
  seconds.sort((a, b) => a - b);
  const medianSeconds = seconds[RUNS >> 1];
  const spread = (seconds[RUNS - 1] - seconds[0]) / medianSeconds;
  return { name, medianSeconds, spread, rate: `${Math.round(bytes / medianSeconds / 1e6)} MB/s` };
}

/** Rows {name, medianSeconds, spread (largest minus smallest of five, over the median), rate}. */
export async function run() {
  const folder = fileURLToPath(new URL('../scratch/', import.meta.url));
  await mkdir(folder, { recursive: true });
  const plain = `${folder}read-csv.csv`;
  const long = `${folder}read-csv-long.csv`;
  try {
    // Three decimals, as detection software that knows its noise writes them; and all 17 digits of a Float64.
    const short = await generate(plain, (random) => [
      (uniformFloat64(random) * 1280).toFixed(3),
      (uniformFloat64(random) * 1024).toFixed(3),
      String(Math.floor(uniformFloat64(random) * 256)),
    ]);
    const full = await generate(long, (random) => [
      String(uniformFloat64(random) * 1280),
      String(uniformFloat64(random) * 1024),
      String(Math.floor(uniformFloat64(random) * 256)),
    ]);
    return [
      await time('read CSV to columns, 3 decimals', short.bytes, short.sums, () => ours(plain, false)),
      await time('scan CSV with SHA-256, 3 decimals', short.bytes, short.sums, async () => {
        const { seconds, sums } = await ours(plain, true);
        return { seconds, sums: { rows: sums.rows } };
      }),
      await time('count newlines, 3 decimals', short.bytes, short.sums, () => newlines(plain)),
      await time('papaparse and Number, 3 decimals', short.bytes, short.sums, () => withPapaparse(plain)),
      await time('read CSV to columns, all digits', full.bytes, full.sums, () => ours(long, false)),
      await time('count newlines, all digits', full.bytes, full.sums, () => newlines(long)),
    ];
  } finally {
    await rm(plain, { force: true });
    await rm(long, { force: true });
  }
}

if (process.argv[1] === fileURLToPath(import.meta.url)) {
  for (const row of await run()) {
    const spread = `${Math.round(row.spread * 100)} %`;
    console.log(`${row.name.padEnd(40)} ${row.medianSeconds.toFixed(3)} s  spread ${spread.padStart(5)}  ${row.rate}`);
  }
}
