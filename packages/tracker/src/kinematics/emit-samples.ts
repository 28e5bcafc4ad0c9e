import type { SampleBlock } from '../core/columns.js';
import { FLAG, NAN } from '../core/columns.js';
import { atBody } from '../screening/at-body.js';
import type { FitParameters } from './fit-parameters.js';
import type { HeldFrames } from './held-frames.js';
import { MARK } from './marks.js';
import { sampleColumns } from './sample-columns.js';

/** Rows of a block of samples at most, where one frame does not hold more. */
const BLOCK_ROWS = 30_000;

/** Samples of the held frames `from .. to - 1`, a block of some frames after the other. New columns. */
export function* emitSamples(
  held: HeldFrames,
  parameters: FitParameters,
  from: number,
  to: number,
): Generator<SampleBlock, void> {
  for (let first = from; first < to; ) {
    let last = first + 1;
    let rows = held.rows[first]!;
    while (last < to && rows + held.rows[last]! <= BLOCK_ROWS) rows += held.rows[last++]!;
    yield samplesOf(held, parameters, first, last);
    first = last;
  }
}

function samplesOf(held: HeldFrames, parameters: FitParameters, first: number, last: number): SampleBlock {
  const { columns, start, rows } = held;
  const { pathline } = columns;
  const offsets = new Uint32Array(last - first + 1);
  let count = 0;
  for (let k = first; k < last; k++) {
    const end = start[k]! + rows[k]!;
    for (let row = start[k]!; row < end; row++) if (pathline[row]! >= 0) count++;
    offsets[k - first + 1] = count;
  }
  const samples = sampleColumns(held.dims, count, {
    number: held.number.slice(first, last),
    time: held.time.slice(first, last),
    segment: held.segment.slice(first, last),
    offsets,
  });
  let s = 0;
  for (let k = first; k < last; k++) {
    const end = start[k]! + rows[k]!;
    for (let row = start[k]!; row < end; row++) if (pathline[row]! >= 0) write(held, row, samples, s++, parameters);
  }
  return samples;
}

function write(held: HeldFrames, row: number, samples: SampleBlock, s: number, parameters: FitParameters): void {
  const { columns } = held;
  const [sx, sy, sz] = parameters.noise;
  const position = columns.positionRoot[row]!;
  const velocity = columns.velocityRoot[row]!;
  const acceleration = columns.accelerationRoot[row]!;
  const px = columns.px[row]!;
  const py = columns.py[row]!;
  samples.pathline[s] = columns.pathline[row]!;
  samples.x[s] = px;
  samples.y[s] = py;
  samples.u[s] = oneNaN(columns.u[row]!);
  samples.v[s] = oneNaN(columns.v[row]!);
  samples.ax[s] = oneNaN(columns.ax[row]!);
  samples.ay[s] = oneNaN(columns.ay[row]!);
  samples.xSe[s] = oneNaN(sx * position);
  samples.ySe[s] = oneNaN(sy * position);
  samples.uSe[s] = oneNaN(sx * velocity);
  samples.vSe[s] = oneNaN(sy * velocity);
  samples.axSe[s] = oneNaN(sx * acceleration);
  samples.aySe[s] = oneNaN(sy * acceleration);
  samples.measuredX[s] = columns.x[row]!;
  samples.measuredY[s] = columns.y[row]!;
  if (held.dims === 3) {
    samples.z[s] = columns.pz[row]!;
    samples.w[s] = oneNaN(columns.w[row]!);
    samples.az[s] = oneNaN(columns.az[row]!);
    samples.zSe[s] = oneNaN(sz * position);
    samples.wSe[s] = oneNaN(sz * velocity);
    samples.azSe[s] = oneNaN(sz * acceleration);
    samples.measuredZ[s] = columns.z[row]!;
  }
  samples.linkRisk[s] = columns.linkRisk[row]!;
  samples.detection[s] = columns.detection[row]!;
  const mark = columns.marks[row]!;
  let flags = columns.flags[row]!;
  if ((mark & (MARK.offFit | MARK.restsOnOff)) !== 0) flags |= FLAG['off-fit'];
  if ((mark & MARK.offNeighbours) !== 0) flags |= FLAG['off-neighbours'];
  if (parameters.bodies.length > 0) flags |= atBody(parameters.bodies, parameters.rim, px, py);
  samples.flags[s] = flags;
}

/** NaN of any sign or payload becomes the one that results carry. */
function oneNaN(value: number): number {
  return Number.isNaN(value) ? NAN : value;
}
