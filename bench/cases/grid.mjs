/**
 * Statistics on a grid: means, all Reynolds stresses and their standard errors of 2 million samples in pathlines of 50.
 * Counts and means are checked against plain sums over the bins.
 */
import { fileURLToPath } from 'node:url';
import { createGridAccumulator } from '@wakeloom/tracker/eulerian/accumulate';
import { gridShape } from '@wakeloom/tracker/eulerian/grid-shape';
import { uniformFloat64 } from 'pure-rand/distribution/uniformFloat64';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import { check, print, rate, timed } from '../lib/timed.mjs';

const PATHLINES = 40_000;
const LENGTH = 50;
const FIELD = 100;
const BIN = 2;
const RUNS = 5;

function made(dims) {
  const random = xoroshiro128plus(13);
  const samples = PATHLINES * LENGTH;
  const f64 = (axis) => new Float64Array(axis < dims ? samples : 0);
  const f32 = (axis) => new Float32Array(axis < dims ? samples : 0);
  const [x, y, z] = [0, 1, 2].map(f64);
  const [u, v, w] = [0, 1, 2].map(f32);
  const [uSe, vSe, wSe] = [0, 1, 2].map((axis) => f32(axis).fill(0.1));
  for (let p = 0; p < PATHLINES; p++) {
    const start = [0, 1, 2].map(() => FIELD * uniformFloat64(random));
    const speed = [0, 1, 2].map(() => 0.4 * uniformFloat64(random) - 0.2);
    for (let k = 0; k < LENGTH; k++) {
      const s = p * LENGTH + k;
      for (const [axis, column] of [x, y, z].slice(0, dims).entries()) {
        column[s] = Math.min(FIELD - 1e-9, Math.max(0, start[axis] + k * speed[axis]));
      }
      for (const [axis, column] of [u, v, w].slice(0, dims).entries()) column[s] = speed[axis] + uniformFloat64(random);
    }
  }
  const rowStart = Uint32Array.from({ length: PATHLINES + 1 }, (_, p) => p * LENGTH);
  return { x, y, z, u, v, w, uSe, vSe, wSe, flags: new Uint16Array(samples), rowStart };
}

export async function run() {
  const rows = [];
  for (const dims of [2, 3]) {
    const data = made(dims);
    const bin = dims === 2 ? [BIN, BIN, BIN] : [4 * BIN, 4 * BIN, 4 * BIN];
    const grid = { bin, overlap: 0, fewestForMean: 5, fewestForStress: 50 };
    const bounds = { min: [0, 0, 0], max: [FIELD, FIELD, dims === 3 ? FIELD : 0] };
    const shape = gridShape(grid, dims, bounds, 1, 1000);
    const options = { fewestForMean: 5, fewestForStress: 50, lengthUnit: 'mm', timeUnit: 's' };
    const once = () => {
      const start = performance.now();
      const bins = createGridAccumulator(shape, dims, options);
      bins.add(data);
      const result = bins.finish();
      return { seconds: (performance.now() - start) / 1000, result };
    };
    const { result } = once();
    const sums = new Map();
    for (let s = 0; s < data.x.length; s++) {
      const cell = [data.x, data.y, data.z].map((column, axis) =>
        axis < dims ? Math.round((column[s] - shape.first[axis]) / shape.step[axis]) : 0,
      );
      const index = (cell[2] * shape.count[1] + cell[1]) * shape.count[0] + cell[0];
      const [count, sum] = sums.get(index) ?? [0, 0];
      sums.set(index, [count + 1, sum + data.u[s]]);
    }
    const mean = result.fields.get('u').values;
    for (const [index, [count, sum]] of sums) {
      check(result.samples[index] === count, `bin ${index} holds ${result.samples[index]} samples, expected ${count}`);
      if (count < 5) continue;
      check(
        Math.abs(mean[index] - sum / count) < 1e-6,
        `mean of bin ${index}: ${mean[index]}, expected ${sum / count}`,
      );
    }
    const time = await timed(RUNS, async () => once().seconds);
    rows.push({
      name: `grid statistics in ${dims}-D, ${shape.count.join(' x ')} bins`,
      ...time,
      rate: rate(data.x.length, time.medianSeconds, 'samples'),
    });
  }
  return rows;
}

if (process.argv[1] === fileURLToPath(import.meta.url)) print(await run());
