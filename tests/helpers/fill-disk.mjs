// Makes a result folder on a disk that is too small, then again with room. Started by tests/faults/disk-full.test.ts
// inside a mount namespace; prints one JSON line a run.
// Arguments: the small disk, samples, 'asked' or 'silent' (a disk that does not tell its free space), bytes of ballast
// that lie on the disk during the first run.
import { readdirSync, rmSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { createContext } from '@wakeloom/tracker';
import { openNodeResultPlace } from '@wakeloom/tracker/node';
import { isCompleteResult } from '@wakeloom/tracker/store/read-result';
import { openResultWriter } from '@wakeloom/tracker/store/result-writer';

const [, , disk, samples, manner, ballast] = process.argv;
const folder = join(disk, 'result');

/** Ten samples a pathline, twenty pathlines in view; values without meaning. */
function* blocks(rows) {
  for (let first = 0; first < rows; first += 200) {
    const f32 = () => Float32Array.from({ length: 200 }, (_, i) => first + i);
    const f64 = () => Float64Array.from({ length: 200 }, (_, i) => first + i / 8);
    const none = new Float32Array(0);
    yield {
      dims: 2,
      number: Int32Array.from({ length: 10 }, (_, k) => first / 20 + k),
      time: Float64Array.from({ length: 10 }, (_, k) => first / 20 + k),
      segment: new Int32Array(10),
      offsets: Uint32Array.from({ length: 11 }, (_, k) => 20 * k),
      pathline: Int32Array.from({ length: 200 }, (_, i) => first / 10 + (i % 20)),
      x: f64(),
      y: f64(),
      z: new Float64Array(0),
      ...{ u: f32(), v: f32(), w: none, ax: f32(), ay: f32(), az: none },
      ...{ xSe: f32(), ySe: f32(), zSe: none, uSe: f32(), vSe: f32(), wSe: none, axSe: f32(), aySe: f32(), azSe: none },
      ...{ measuredX: f64(), measuredY: f64(), measuredZ: new Float64Array(0) },
      linkRisk: f32(),
      detection: Float64Array.from({ length: 200 }, (_, i) => first + i),
      flags: new Uint16Array(200),
    };
  }
}

async function run() {
  try {
    const real = await openNodeResultPlace(folder, { create: true });
    const place = manner === 'silent' ? { ...real, freeBytes: () => null } : real;
    const writer = openResultWriter(place, {
      dims: 2,
      pairs: false,
      units: { length: 'mm', time: 's' },
      shortest: 3,
      bridge: 2,
      keepPathlines: 'all',
      keepFrames: 'all',
      stuckFactor: 3,
      noise: [0, 0, 0],
      ramLimit: 2 ** 28,
      context: createContext(),
    });
    for (const block of blocks(Number(samples))) await writer.add(block);
    await writer.finish(() => {});
    const record = { schema: '1.1', program: { name: 'wakeloom', version: '0' }, counts: {}, figures: {} };
    await writer.complete(record, '<!doctype html><title>made</title>', []);
    return { code: null };
  } catch (error) {
    return { code: error.code ?? 'none', message: error.message, details: error.details ?? null };
  }
}

async function report(outcome) {
  const place = await openNodeResultPlace(folder, { create: false });
  const state = { files: readdirSync(folder), complete: await isCompleteResult(place) };
  process.stdout.write(`${JSON.stringify({ ...outcome, ...state })}\n`);
}

writeFileSync(join(disk, 'ballast'), Buffer.alloc(Number(ballast)));
await report(await run());
rmSync(join(disk, 'ballast'));
await report(await run());
