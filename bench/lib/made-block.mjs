import { createFrameSorter } from '@wakeloom/tracker/detections/canonical-order';
import { resolveRun } from '@wakeloom/tracker/run/resolve';
import { madeFrames } from './made-frames.mjs';

/** Frames a second and length of a px of all made runs. */
export const RATE = 100;
const SCALE = 0.05;

/** Settings of a made run, as the command would resolve them. */
export function madeSettings(options = {}) {
  const typed = { rate: `${RATE} Hz`, scale: `${SCALE} mm/px`, ...options };
  return resolveRun({ options: typed, dumpFiles: ['made'] }).settings;
}

/** Made frames as one calibrated block (mm, rows in canonical order), and the true particle of each row. */
export function madeBlock({ frames, perFrame, ratio, seed, dims = 2 }) {
  const rows = frames * perFrame;
  const particle = new Int32Array(rows);
  const block = {
    dims,
    number: Int32Array.from({ length: frames }, (_, k) => k),
    time: Float64Array.from({ length: frames }, (_, k) => k / RATE),
    segment: new Int32Array(frames),
    offsets: Uint32Array.from({ length: frames + 1 }, (_, k) => k * perFrame),
    x: new Float64Array(rows),
    y: new Float64Array(rows),
    z: new Float64Array(dims === 3 ? rows : 0),
    brightness: new Float32Array(0),
    row: Float64Array.from({ length: rows }, (_, row) => row),
    given: new Int32Array(0),
  };
  const sort = createFrameSorter();
  for (const frame of madeFrames({ frames, perFrame, ratio, seed, dims })) {
    const from = frame.number * perFrame;
    for (let i = 0; i < perFrame; i++) {
      block.x[from + i] = SCALE * frame.x[i];
      block.y[from + i] = SCALE * frame.y[i];
      if (dims === 3) block.z[from + i] = SCALE * frame.z[i];
    }
    particle.set(frame.particle, from);
    sort(block, from, from + perFrame);
  }
  return { block, particle: Int32Array.from(block.row, (row) => particle[row]) };
}
