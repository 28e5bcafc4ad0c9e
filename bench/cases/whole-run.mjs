/**
 * Ten million detections, 1000 frames of 10 000, from CSV to a complete result folder through the command, with the peak
 * of resident memory; beside a newline count and papaparse on the same file, and the same run with its linking on
 * kd-tree-javascript. Counts of rows are checked in all of them, and that threads and searches leave the same result.
 * The bar: 400 MB resident.
 */
import { createReadStream, mkdirSync, openSync, readSync, rmSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import papaparse from 'papaparse';
import { writeMadeCsv } from '../lib/made-csv.mjs';
import { processed, stagesOf } from '../lib/processed.mjs';
import { check, print, rate, seconds } from '../lib/timed.mjs';

const FRAMES = 1000;
const PER_FRAME = 10_000;
const ROWS = FRAMES * PER_FRAME;
/** Largest resident memory of the ten million with default settings, bytes. */
const MEMORY_BAR = 400e6;

const folder = fileURLToPath(new URL('../scratch/whole-run/', import.meta.url));
const out = `${folder}result`;

function countNewlines(csv) {
  const buffer = new Uint8Array(1 << 20);
  const file = openSync(csv, 'r');
  let count = 0;
  for (;;) {
    const got = readSync(file, buffer);
    if (got === 0) return count;
    for (let i = 0; i < got; i++) if (buffer[i] === 10) count++;
  }
}

function papaparseRows(csv) {
  return new Promise((resolve, reject) => {
    let rows = 0;
    papaparse.parse(createReadStream(csv, { highWaterMark: 1 << 20 }), {
      delimiter: ',',
      fastMode: true,
      chunk: ({ data }) => {
        for (const row of data) if (row.length === 3 && Number(row[1]) >= -10) rows++;
      },
      complete: () => resolve(rows),
      error: reject,
    });
  });
}

const once = { spread: null };
const megabytes = (bytes) => Math.round(bytes / 1e6);

export async function run() {
  rmSync(folder, { recursive: true, force: true });
  mkdirSync(folder, { recursive: true });
  try {
    const csv = `${folder}ten-million.csv`;
    const { bytes } = writeMadeCsv(csv, { frames: FRAMES, perFrame: PER_FRAME, ratio: 0.3, seed: 11 });
    const rows = [];
    let digest = null;
    for (const threads of [1, 2]) {
      const { seconds: took, peakBytes, record } = await processed(csv, out, ROWS, '--threads', String(threads));
      digest ??= record.digest.content;
      check(digest === record.digest.content, `${threads} threads leave another result`);
      rows.push({
        name: `whole run, 10 million detections, ${threads} thread${threads > 1 ? 's' : ' (default)'}`,
        medianSeconds: took,
        ...once,
        rate: rate(ROWS, took, 'detections'),
        peakMegabytes: megabytes(peakBytes),
        note: `${threads > 1 ? '' : peakBytes <= MEMORY_BAR ? 'within 400 MB; ' : 'ABOVE 400 MB; '}${stagesOf(record)}`,
      });
    }
    const perSecond = (took) => `${Math.round(bytes / took / 1e6)} MB/s`;
    const newlines = await seconds(() => check(countNewlines(csv) === ROWS + 1, 'count of newlines'));
    rows.push({ name: 'newline count of the same file', medianSeconds: newlines, ...once, rate: perSecond(newlines) });
    const parsed = await seconds(async () => check((await papaparseRows(csv)) === ROWS, 'rows of papaparse'));
    rows.push({
      name: 'papaparse and Number of the same file',
      medianSeconds: parsed,
      ...once,
      rate: perSecond(parsed),
    });

    const tree = await processed(csv, out, ROWS, '--search', 'kd-tree');
    check(digest === tree.record.digest.content, 'the two searches leave other results');
    rows.push({
      name: 'whole run, 10 million detections, linked on kd-tree-javascript',
      medianSeconds: tree.seconds,
      ...once,
      rate: rate(ROWS, tree.seconds, 'detections'),
      peakMegabytes: megabytes(tree.peakBytes),
    });
    return rows;
  } finally {
    rmSync(folder, { recursive: true, force: true });
  }
}

if (process.argv[1] === fileURLToPath(import.meta.url)) print(await run());
