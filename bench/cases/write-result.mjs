/**
 * Writing a result folder: 10 million samples in 1000 frames from blocks in memory to pathlines.nc and frames.nc, read
 * back against their digest. The answer is checked before anything is timed. Run alone with
 * `node bench/cases/write-result.mjs [frames]` after `npm run compile`, or through bench/run.mjs.
 */

import { mkdirSync, rmSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import { createContext } from '@wakeloom/tracker';
import { openNodeResultPlace } from '@wakeloom/tracker/node';
import { openHdf5Reader } from '@wakeloom/tracker/store/hdf5-reader';
import { openResultWriter } from '@wakeloom/tracker/store/result-writer';

const PARTICLES = 10_000;
const FRAMES_A_BLOCK = 20;
const RUNS = 3;

/** Samples of a pathline in slot `slot`: 10 to 40, whatever the frame. */
const lifeOf = (slot) => 10 + (slot % 31);

/** Blocks in which the pathline of a slot gives way to the next whenever its life is over. All columns are filled. */
function* blocks(frames) {
  const number = new Int32Array(PARTICLES);
  let next = 0;
  for (let first = 0; first < frames; first += FRAMES_A_BLOCK) {
    const count = Math.min(FRAMES_A_BLOCK, frames - first);
    const rows = count * PARTICLES;
    const none = new Float32Array(0);
    const block = {
      dims: 2,
      number: Int32Array.from({ length: count }, (_, k) => first + k),
      time: Float64Array.from({ length: count }, (_, k) => (first + k) / 64),
      segment: new Int32Array(count),
      offsets: Uint32Array.from({ length: count + 1 }, (_, k) => k * PARTICLES),
      pathline: new Int32Array(rows),
      z: new Float64Array(0),
      measuredZ: new Float64Array(0),
      flags: new Uint16Array(rows),
      ...{ w: none, az: none, zSe: none, wSe: none, azSe: none },
    };
    for (const key of ['x', 'y', 'measuredX', 'measuredY', 'detection']) block[key] = new Float64Array(rows);
    const singles = ['u', 'v', 'ax', 'ay', 'xSe', 'ySe', 'uSe', 'vSe', 'axSe', 'aySe', 'linkRisk'];
    for (const key of singles) block[key] = new Float32Array(rows);
    for (let k = 0, row = 0; k < count; k++) {
      for (let slot = 0; slot < PARTICLES; slot++, row++) {
        if ((first + k) % lifeOf(slot) === 0) number[slot] = next++;
        block.pathline[row] = number[slot];
        block.x[row] = number[slot] + (first + k) / 1024;
        block.y[row] = slot - (first + k) / 512;
        block.measuredX[row] = block.x[row] + 0.001;
        block.measuredY[row] = block.y[row] - 0.001;
        block.detection[row] = (first + k) * PARTICLES + slot;
        for (let c = 0; c < singles.length; c++) block[singles[c]][row] = c + slot / 8192;
      }
    }
    yield block;
  }
}

/** One run; seconds by phase, and the largest resident memory less what was there before, MB. */
async function once(folder, frames) {
  const place = await openNodeResultPlace(folder, { create: true });
  const marks = [];
  const mark = (name) => marks.push([name, performance.now()]);
  const watched = {
    ...place,
    async sync(file) {
      mark(file.endsWith('pathlines.nc') ? 'to pathline order, pathlines.nc' : 'frames.nc');
      await place.sync(file);
      mark('sync');
    },
    rename(from, to) {
      mark('read back against the digest');
      place.rename(from, to);
    },
  };
  const before = process.memoryUsage().rss;
  let peak = before;
  const options = {
    ...{ dims: 2, pairs: false, units: { length: 'mm', time: 's' }, shortest: 5, bridge: 2 },
    ...{ keepPathlines: 'all', keepFrames: 'all', stuckFactor: 4, noise: [0.001, 0.001, 0.001], ramLimit: 2 ** 28 },
    context: createContext({
      onProgress: () => {
        peak = Math.max(peak, process.memoryUsage().rss);
      },
    }),
  };
  const writer = openResultWriter(watched, options);
  const seconds = { 'add blocks': 0 };
  for (const block of blocks(frames)) {
    const start = performance.now();
    await writer.add(block);
    seconds['add blocks'] += (performance.now() - start) / 1000;
  }
  mark('start');
  const finished = await writer.finish(() => {});
  for (let i = 1; i < marks.length; i++) {
    seconds[marks[i][0]] = (seconds[marks[i][0]] ?? 0) + (marks[i][1] - marks[i - 1][1]) / 1000;
  }
  seconds['whole'] = Object.values(seconds).reduce((sum, each) => sum + each, 0);
  return { place, finished, seconds, writer, megabytes: (peak - before) / 1e6 };
}

/** Every sample once, each detection in its pathline's rows in frame order. */
function check({ place, finished }, folder, frames) {
  const file = openHdf5Reader(place.hdf5, `${folder}/pathlines.nc`, folder);
  const rowSize = file.dataset('row_size').rows(0, finished.pathlines);
  let row = 0;
  const seen = new Uint8Array(frames * PARTICLES);
  for (const size of rowSize) {
    const detection = file.dataset('detection').rows(row, row + size);
    for (let i = 0; i < size; i++) {
      seen[detection[i]]++;
      if (i > 0 && detection[i] !== detection[i - 1] + PARTICLES) throw new Error(`row ${row + i} is out of order`);
    }
    row += size;
  }
  file.close();
  const once = seen.reduce((sum, count) => sum + (count === 1 ? 1 : 0), 0);
  if (once !== finished.samples || once + finished.shortFragmentDetections !== frames * PARTICLES) {
    throw new Error(`${once} detections are in the file once, expected ${finished.samples}`);
  }
}

/** Rows {name, medianSeconds, spread (largest minus smallest, over the median), rate}. */
export async function run(frames = 1000) {
  const folder = fileURLToPath(new URL('../scratch/write-result', import.meta.url));
  mkdirSync(folder, { recursive: true });
  try {
    const small = await once(folder, 100);
    check(small, folder, 100);
    small.writer.abandon();
    const runs = [];
    for (let i = 0; i < RUNS; i++) {
      const each = await once(folder, frames);
      each.writer.abandon();
      runs.push(each);
    }
    const memory = `${Math.round(Math.max(...runs.map((each) => each.megabytes)))} MB more resident`;
    return Object.keys(runs[0].seconds).map((phase) => {
      const sorted = runs.map(({ seconds }) => seconds[phase]).sort((a, b) => a - b);
      const medianSeconds = sorted[RUNS >> 1];
      const spread = (sorted[RUNS - 1] - sorted[0]) / medianSeconds;
      const million = (runs[0].finished.samples / medianSeconds / 1e6).toFixed(1);
      const rate = `${million} M samples/s${phase === 'whole' ? `, ${memory}` : ''}`;
      return { name: `result folder: ${phase}`, medianSeconds, spread, rate };
    });
  } finally {
    rmSync(folder, { recursive: true, force: true });
  }
}

if (process.argv[1] === fileURLToPath(import.meta.url)) {
  for (const row of await run(Number(process.argv[2] ?? 1000))) {
    const spread = `${Math.round(row.spread * 100)} %`;
    console.log(`${row.name.padEnd(50)} ${row.medianSeconds.toFixed(2)} s  spread ${spread.padStart(5)}  ${row.rate}`);
  }
}
