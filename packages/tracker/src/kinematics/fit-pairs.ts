import type { LinkedBlock, SampleBlock } from '../core/columns.js';
import { FLAG, NAN, rowCount } from '../core/columns.js';
import { atBody } from '../screening/at-body.js';
import { linkFlag } from '../screening/flags.js';
import { MedianScreen } from '../screening/normalised-median.js';
import type { FitParameters } from './fit-parameters.js';
import type { CoreRange } from './fit-window.js';
import { MARK } from './marks.js';
import { sampleColumns } from './sample-columns.js';

/**
 * Samples of image pairs: each pair of detections that is linked gives one, at the mid-point and mid-time, in the
 * place of the first (frame, detection, measured position). Velocity is displacement over delay; its standard error
 * sigma sqrt(2) / delay, that of the position sigma / sqrt(2); accelerations are NaN. The normalised median test
 * looks at neighbours of the same pair only. Second frames of pairs give no frame of the result.
 */
export function* fitPairs(
  window: LinkedBlock,
  core: CoreRange,
  parameters: FitParameters,
): Generator<void, SampleBlock> {
  const { number, segment, offsets } = window;
  const pairs: number[] = [];
  for (let k = core.from; k < core.to; k++) {
    const second = k > 0 && segment[k - 1] === segment[k];
    if (!second) pairs.push(k);
  }
  const base = offsets[core.from]!;
  const partner = partners(window, pairs, base);
  const frames = {
    number: new Int32Array(pairs.length),
    time: new Float64Array(pairs.length),
    segment: new Int32Array(pairs.length),
    offsets: new Uint32Array(pairs.length + 1),
  };
  let rows = 0;
  for (const [p, k] of pairs.entries()) {
    frames.number[p] = number[k]!;
    frames.segment[p] = segment[k]!;
    const paired = k + 1 < number.length && segment[k + 1] === segment[k];
    frames.time[p] = paired ? (window.time[k]! + window.time[k + 1]!) / 2 : window.time[k]!;
    for (let r = offsets[k]!; r < offsets[k + 1]!; r++) if (partner[r - base]! >= 0) rows++;
    frames.offsets[p + 1] = rows;
  }
  const samples = sampleColumns(window.dims, rows, frames);
  let s = 0;
  for (const k of pairs) {
    for (let r = offsets[k]!; r < offsets[k + 1]!; r++) {
      const other = partner[r - base]!;
      if (other >= 0) writePair(window, k, r, other, samples, s++, parameters);
    }
    yield;
  }
  yield* screenPairs(samples, parameters);
  return samples;
}

/** Row of the partner in the second frame of each row from row `base` on, -1 without one. */
function partners(window: LinkedBlock, pairs: readonly number[], base: number): Int32Array {
  const { offsets, segment, pathline, number } = window;
  const end = rowCount(window);
  const partner = new Int32Array(Math.max(0, end - base)).fill(-1);
  for (const k of pairs) {
    if (!(k + 1 < number.length && segment[k + 1] === segment[k])) continue;
    const rowOf = new Map<number, number>();
    for (let r = offsets[k + 1]!; r < offsets[k + 2]!; r++) if (pathline[r]! >= 0) rowOf.set(pathline[r]!, r);
    for (let r = offsets[k]!; r < offsets[k + 1]!; r++) partner[r - base] = rowOf.get(pathline[r]!) ?? -1;
  }
  return partner;
}

function writePair(
  window: LinkedBlock,
  k: number,
  r: number,
  other: number,
  samples: SampleBlock,
  s: number,
  parameters: FitParameters,
): void {
  const delay = window.time[k + 1]! - window.time[k]!;
  const [sx, sy, sz] = parameters.noise;
  const share = Math.sqrt(0.5);
  const gain = Math.sqrt(2) / delay;
  samples.pathline[s] = window.pathline[r]!;
  samples.x[s] = (window.x[r]! + window.x[other]!) / 2;
  samples.y[s] = (window.y[r]! + window.y[other]!) / 2;
  samples.u[s] = (window.x[other]! - window.x[r]!) / delay;
  samples.v[s] = (window.y[other]! - window.y[r]!) / delay;
  samples.ax[s] = NAN;
  samples.ay[s] = NAN;
  samples.axSe[s] = NAN;
  samples.aySe[s] = NAN;
  samples.xSe[s] = sx * share;
  samples.ySe[s] = sy * share;
  samples.uSe[s] = sx * gain;
  samples.vSe[s] = sy * gain;
  samples.measuredX[s] = window.x[r]!;
  samples.measuredY[s] = window.y[r]!;
  if (window.dims === 3) {
    samples.z[s] = (window.z[r]! + window.z[other]!) / 2;
    samples.w[s] = (window.z[other]! - window.z[r]!) / delay;
    samples.az[s] = NAN;
    samples.azSe[s] = NAN;
    samples.zSe[s] = sz * share;
    samples.wSe[s] = sz * gain;
    samples.measuredZ[s] = window.z[r]!;
  }
  samples.linkRisk[s] = window.linkRisk[other]!;
  samples.detection[s] = window.row[r]!;
  let flags = linkFlag(window.linkRisk[other]!, 0, parameters.riskLimit);
  if (parameters.bodies.length > 0) flags |= atBody(parameters.bodies, parameters.rim, samples.x[s]!, samples.y[s]!);
  samples.flags[s] = flags;
}

function* screenPairs(samples: SampleBlock, parameters: FitParameters): Generator<void, void> {
  const screen = new MedianScreen({
    threshold: parameters.medianThreshold,
    neighbours: parameters.medianNeighbours,
    epsilon: parameters.medianEpsilon,
    noise: parameters.noise,
  });
  const rows = rowCount(samples);
  const root = new Float32Array(rows);
  // Standard error over noise is the same along every axis; noise 0 has standard error 0.
  for (let s = 0; s < rows; s++) root[s] = parameters.noise[0] > 0 ? samples.uSe[s]! / parameters.noise[0] : 0;
  const marks = new Uint8Array(rows);
  const candidates = new Uint32Array(rows);
  const { dims, x, y, z, u, v, w } = samples;
  for (let p = 0; p + 1 < samples.offsets.length; p++) {
    const from = samples.offsets[p]!;
    const count = samples.offsets[p + 1]! - from;
    for (let i = 0; i < count; i++) candidates[i] = from + i;
    screen.judge({ dims, x, y, z, u, v, w, root }, candidates, count, count, marks, MARK.offNeighbours);
    yield;
  }
  for (let s = 0; s < rows; s++) {
    if ((marks[s]! & MARK.offNeighbours) !== 0) samples.flags[s] = samples.flags[s]! | FLAG['off-neighbours'];
  }
}
