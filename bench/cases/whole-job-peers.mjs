/**
 * Ten million detections, 200 frames of 50 000, from CSV to a complete result folder at default settings, beside a program
 * on pandas, scipy, numpy and netCDF4 (`bench/peers/whole-job.py`, which says what it leaves out) that leaves the same
 * columns. The links of both are held against the true particles first; then they run in turns. The bars: ours five times
 * faster, 300 MB resident. Wants python3 with pandas, scipy and netCDF4 (Debian: python3-pandas python3-scipy
 * python3-netcdf4).
 */
import { execFileSync } from 'node:child_process';
import { mkdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import { writeMadeCsv } from '../lib/made-csv.mjs';
import { madeFrames } from '../lib/made-frames.mjs';
import { processed, stagesOf } from '../lib/processed.mjs';
import { runWatched } from '../lib/run-watched.mjs';
import { check, print, rate } from '../lib/timed.mjs';

const FRAMES = Number(process.env.FRAMES ?? 200);
const PER_FRAME = Number(process.env.PER_FRAME ?? 50_000);
const ROWS = FRAMES * PER_FRAME;
const MADE = { frames: FRAMES, perFrame: PER_FRAME, ratio: 0.3, seed: 11 };
const RUNS = 3;
/** Bars: times faster, and bytes resident. */
const FASTER = 5;
const MEMORY_BAR = 300e6;

const PYTHON = '/usr/bin/python3';
const folder = fileURLToPath(new URL('../scratch/whole-job/', import.meta.url));
const peer = (name) => fileURLToPath(new URL(`../peers/${name}`, import.meta.url));
const csv = `${folder}made.csv`;

/** Precision and recall of the links of a result. */
function linksOf(out) {
  const words = [peer('check-links.py'), `${out}/pathlines.nc`, `${folder}particles`, `${folder}frames`];
  const { made, right, true: all } = JSON.parse(execFileSync(PYTHON, words, { encoding: 'utf8' }));
  return { precision: right / made, recall: right / all };
}

function writeTruth() {
  const particle = new Int32Array(ROWS);
  const frame = new Int32Array(ROWS);
  for (const made of madeFrames(MADE)) {
    particle.set(made.particle, made.number * PER_FRAME);
    frame.fill(made.number, made.number * PER_FRAME, (made.number + 1) * PER_FRAME);
  }
  writeFileSync(`${folder}particles`, particle);
  writeFileSync(`${folder}frames`, frame);
}

async function runPeer(span, bins) {
  const out = `${folder}peer`;
  rmSync(out, { recursive: true, force: true });
  const watched = await runWatched([peer('whole-job.py'), csv, out, '100', '0.05', `${span}`, `${bins}`], PYTHON);
  check(watched.code === 0, `exit ${watched.code}: ${watched.said}`);
  const { samples } = JSON.parse(readFileSync(`${out}/run.json`, 'utf8'));
  check(samples > 0.9 * ROWS, `${samples} samples of the peer`);
  return watched;
}

/** Bins along the longer side of a result's grid. */
function binsOf(out) {
  const lines = readFileSync(`${out}/log.ndjson`, 'utf8').trim().split('\n');
  const { details } = lines.map((line) => JSON.parse(line)).find(({ code }) => code === 'run/written');
  return Math.max(...details.bins);
}

function row(name, runs, note) {
  const seconds = runs.map((one) => one.seconds).sort((a, b) => a - b);
  const medianSeconds = seconds[seconds.length >> 1];
  const processor = runs.map((one) => one.processorSeconds).sort((a, b) => a - b)[runs.length >> 1];
  return {
    name,
    medianSeconds,
    spread: (seconds[seconds.length - 1] - seconds[0]) / medianSeconds,
    rate: rate(ROWS, medianSeconds, 'detections'),
    peakMegabytes: Math.round(Math.max(...runs.map((one) => one.peakBytes)) / 1e6),
    note: `${note}; ${processor.toFixed(1)} s of processor time`,
  };
}

const percent = (share) => `${(100 * share).toFixed(2)} %`;
const links = ({ precision, recall }) => `links ${percent(precision)} right, ${percent(recall)} found`;

export async function run() {
  rmSync(folder, { recursive: true, force: true });
  mkdirSync(folder, { recursive: true });
  try {
    writeMadeCsv(csv, MADE);
    writeTruth();
    const out = `${folder}result`;
    const { record } = await processed(csv, out, ROWS);
    const { span } = record.prior;
    const bins = binsOf(out);
    const ours = linksOf(out);
    check(ours.precision > 0.995 && ours.recall > 0.99, `our links: ${links(ours)}`);
    await runPeer(span, bins);
    const theirs = linksOf(`${folder}peer`);
    check(theirs.precision > 0.98 && theirs.recall > 0.98, `links of the peer: ${links(theirs)}`);
    const own = [];
    const two = [];
    const peers = [];
    for (let k = 0; k < RUNS; k++) {
      own.push(await processed(csv, out, ROWS));
      check(own[k].record.digest.content === record.digest.content, 'another result the second time');
      two.push(await processed(csv, out, ROWS, '--threads', '2'));
      check(two[k].record.digest.content === record.digest.content, 'two threads leave another result');
      peers.push(await runPeer(span, bins));
    }
    const million = `${ROWS / 1e6} million detections`;
    const rows = [
      row(`whole job, ${million}, default settings`, own, ''),
      row(`whole job, ${million}, two threads`, two, stagesOf(two[0].record)),
      row(`whole job, ${million}, pandas + scipy + numpy + netCDF4`, peers, links(theirs)),
    ];
    const [one, , other] = rows;
    const times = other.medianSeconds / one.medianSeconds;
    const verdict = (holds, bar) => (holds ? `within ${bar}` : `BAR MISSED: ${bar}`);
    one.note = [
      `${times.toFixed(2)} times the peer's speed, ${verdict(times >= FASTER, `${FASTER} times`)}`,
      verdict(1e6 * one.peakMegabytes <= MEMORY_BAR, '300 MB'),
      links(ours),
      `${stagesOf(own[0].record)}${one.note}`,
    ].join('; ');
    rows[1].note = `${(one.medianSeconds / rows[1].medianSeconds).toFixed(2)} times one thread; ${rows[1].note}`;
    return rows;
  } finally {
    rmSync(folder, { recursive: true, force: true });
  }
}

if (process.argv[1] === fileURLToPath(import.meta.url)) print(await run());
