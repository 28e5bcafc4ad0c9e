/**
 * The store: a million samples from blocks in frame order to pathlines.nc and frames.nc, read back against their digest,
 * beside writing as many plain bytes and bringing them to the disk. The files are checked by reading some of them.
 */
import { closeSync, fsyncSync, mkdirSync, openSync, rmSync, statSync, writeSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import { createContext } from '@wakeloom/tracker';
import { openNodeResultPlace } from '@wakeloom/tracker/node';
import { openHdf5Reader } from '@wakeloom/tracker/store/hdf5-reader';
import { openResultWriter } from '@wakeloom/tracker/store/result-writer';
import { madeSamples } from '../lib/made-samples.mjs';
import { check, print, rate, timed } from '../lib/timed.mjs';

const FRAMES = 100;
const PER_FRAME = 10_000;
const BLOCK_FRAMES = 5;
const RUNS = 3;
const folder = fileURLToPath(new URL('../scratch/store/', import.meta.url));

/** Blocks of a few frames with columns of their own, since the writer takes them. */
function blocksOf(samples) {
  const rows = samples.flags.length;
  return Array.from({ length: FRAMES / BLOCK_FRAMES }, (_, b) => {
    const first = b * BLOCK_FRAMES;
    const [from, to] = [samples.offsets[first], samples.offsets[first + BLOCK_FRAMES]];
    const cut = ([name, value]) => {
      if (!ArrayBuffer.isView(value)) return [name, value];
      if (name === 'offsets')
        return [name, value.slice(first, first + BLOCK_FRAMES + 1).map((offset) => offset - from)];
      if (value.length === rows) return [name, value.slice(from, to)];
      return [name, value.length === FRAMES ? value.slice(first, first + BLOCK_FRAMES) : value.slice()];
    };
    return Object.fromEntries(Object.entries(samples).map(cut));
  });
}

async function store(samples) {
  rmSync(folder, { recursive: true, force: true });
  const place = await openNodeResultPlace(folder, { create: true });
  const blocks = blocksOf(samples);
  const start = performance.now();
  const writer = openResultWriter(place, {
    dims: 2,
    pairs: false,
    units: { length: 'mm', time: 's' },
    shortest: 5,
    bridge: 2,
    keepPathlines: 'all',
    keepFrames: 'all',
    stuckFactor: 4,
    noise: [0.005, 0.005, 0],
    ramLimit: 2 ** 28,
    context: createContext(),
  });
  for (const block of blocks) await writer.add(block);
  const finished = await writer.finish(() => {});
  return { seconds: (performance.now() - start) / 1000, finished, place };
}

function plainBytes(bytes) {
  mkdirSync(folder, { recursive: true });
  const piece = new Uint8Array(1 << 20).fill(7);
  const file = openSync(`${folder}plain`, 'w');
  const start = performance.now();
  for (let done = 0; done < bytes; ) done += writeSync(file, piece, 0, Math.min(piece.length, bytes - done));
  fsyncSync(file);
  closeSync(file);
  return (performance.now() - start) / 1000;
}

export async function run() {
  const samples = madeSamples({ frames: FRAMES, perFrame: PER_FRAME, ratio: 0.3, seed: 9 });
  try {
    const { finished, place } = await store(samples);
    const bySize = new Map();
    for (const id of samples.pathline) bySize.set(id, (bySize.get(id) ?? 0) + 1);
    const kept = [...bySize.values()].filter((count) => count >= 5).reduce((sum, count) => sum + count, 0);
    check(finished.samples === kept, `${finished.samples} samples stored, expected ${kept}`);
    const file = openHdf5Reader(await place.hdf5(), place.hdf5Path('.partial-pathlines.nc'), 'pathlines.nc');
    const detection = file.dataset('/detection').rows(0, kept);
    const u = file.dataset('/u').rows(0, kept);
    const rowOf = new Map();
    for (let row = 0; row < samples.detection.length; row++) rowOf.set(samples.detection[row], row);
    for (let s = 0; s < kept; s += 997) {
      const expected = samples.u[rowOf.get(Number(detection[s]))];
      check(Object.is(u[s], expected), `u of sample ${s} is ${u[s]}, expected ${expected}`);
    }
    file.close();
    const bytes = ['pathlines.nc', 'frames.nc'].reduce(
      (sum, name) => sum + statSync(`${folder}.partial-${name}`).size,
      0,
    );
    const time = await timed(RUNS, async () => (await store(samples)).seconds);
    const plain = await timed(RUNS, async () => plainBytes(bytes));
    const size = `${Math.round(bytes / kept)} bytes a sample`;
    return [
      {
        name: `store 1 million samples, read back (${size})`,
        ...time,
        rate: rate(kept, time.medianSeconds, 'samples'),
      },
      {
        name: 'plain bytes of that size and fsync',
        ...plain,
        rate: `${Math.round(bytes / plain.medianSeconds / 1e6)} MB/s`,
      },
    ];
  } finally {
    rmSync(folder, { recursive: true, force: true });
  }
}

if (process.argv[1] === fileURLToPath(import.meta.url)) print(await run());
