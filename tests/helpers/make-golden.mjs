// Makes the golden folder of the current schema version: node tests/helpers/make-golden.mjs FOLDER (after a build).
// Golden folders are made once, when a schema version is released, and never again: tests read them with later code.
// What the samples are stands in tests/helpers/golden-values.mjs, in closed form.
import { createContext, SCHEMA_VERSION } from '@wakeloom/tracker';
import { openNodeResultPlace } from '@wakeloom/tracker/node';
import { openResultWriter } from '@wakeloom/tracker/store/result-writer';
import { FRAMES, goldenGrid, goldenSample, PATHLINES } from './golden-values.mjs';

const place = await openNodeResultPlace(process.argv[2], { create: true });
const writer = openResultWriter(place, {
  dims: 2,
  pairs: false,
  units: { length: 'mm', time: 's' },
  shortest: 2,
  bridge: 2,
  keepPathlines: 'all',
  keepFrames: 'all',
  stuckFactor: 3,
  noise: [0.001, 0.001, 0.001],
  ramLimit: 2 ** 28,
  context: createContext(),
  title: 'golden',
});
for (let k = 0; k < FRAMES; k++) {
  const rows = Array.from({ length: PATHLINES }, (_, p) => goldenSample(p, k)).filter((row) => row !== null);
  const f32 = (key) => Float32Array.from(rows, (row) => row[key]);
  const f64 = (key) => Float64Array.from(rows, (row) => row[key]);
  const none = { z: new Float64Array(0), measuredZ: new Float64Array(0) };
  for (const key of ['w', 'az', 'zSe', 'wSe', 'azSe']) none[key] = new Float32Array(0);
  await writer.add({
    dims: 2,
    number: Int32Array.of(rows[0].frame),
    time: Float64Array.of(rows[0].time),
    segment: Int32Array.of(0),
    offsets: Uint32Array.of(0, rows.length),
    pathline: Int32Array.from(rows, (row) => row.provisional),
    ...none,
    ...Object.fromEntries(['x', 'y', 'measuredX', 'measuredY', 'detection'].map((key) => [key, f64(key)])),
    ...Object.fromEntries(['u', 'v', 'ax', 'ay', 'linkRisk'].map((key) => [key, f32(key)])),
    ...Object.fromEntries(['xSe', 'ySe', 'uSe', 'vSe', 'axSe', 'aySe'].map((key) => [key, f32(key)])),
    flags: Uint16Array.from(rows, (row) => row.flags),
  });
}
const finished = await writer.finish(() => {});
await writer.writeGrid(goldenGrid(), {});
const zero = {
  meanSpeed: 0,
  peakSpeed: 0,
  displacementRatio: 0,
  displacementRatio95: 0,
  noise: [0, 0],
  medianVelocitySe: 0,
};
await writer.complete(
  {
    schema: SCHEMA_VERSION,
    program: { name: 'wakeloom', version: '0.1.0' },
    run: 'golden',
    settings: [{ key: 'linking.shortest', value: 2, unit: null, origin: 'option' }],
    assumptions: ['y counts as up'],
    notes: { operator: 'nobody: invented data' },
    inputs: [],
    format: 'text',
    columns: {},
    counts: { samples: finished.samples, pathlines: finished.pathlines, flagged: finished.flagged },
    prior: { noise: [0.001, 0.001, 0.001], span: 5 },
    figures: { ...zero, velocityUnit: 'mm/s', lengthUnit: 'mm', timeUnit: 's', medianPathlineSamples: 8 },
    systematic: [],
    warnings: [],
    verdict: null,
    clockTimes: { started: '2020-01-01T00:00:00Z', finished: '2020-01-01T00:00:01Z', seconds: {} },
    host: { name: 'golden', platform: 'none', runtime: 'none', threads: 1 },
  },
  '<!doctype html><title>golden</title>',
  ['{"code":"run/golden","level":"info","message":"made for tests","details":{}}'],
);
