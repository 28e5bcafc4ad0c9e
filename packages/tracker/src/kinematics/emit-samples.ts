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
  let most = 0;
  for (let k = first; k < last; k++) most += rows[k]!;
  /** Row of each sample. */
  const list = new Int32Array(most);
  const offsets = new Uint32Array(last - first + 1);
  let count = 0;
  for (let k = first; k < last; k++) {
    const end = start[k]! + rows[k]!;
    for (let row = start[k]!; row < end; row++) if (pathline[row]! >= 0) list[count++] = row;
    offsets[k - first + 1] = count;
  }
  const samples = sampleColumns(held.dims, count, {
    number: held.number.slice(first, last),
    time: held.time.slice(first, last),
    segment: held.segment.slice(first, last),
    offsets,
  });
  // Column after column: with all of them open at once each sample would touch fifty places in memory.
  const [sx, sy, sz] = parameters.noise;
  const { positionRoot, velocityRoot, accelerationRoot } = columns;
  for (let s = 0; s < count; s++) samples.pathline[s] = pathline[list[s]!]!;
  takeDoubles(columns.px, list, samples.x);
  takeDoubles(columns.py, list, samples.y);
  takeDoubles(columns.x, list, samples.measuredX);
  takeDoubles(columns.y, list, samples.measuredY);
  takeDoubles(columns.detection, list, samples.detection);
  takeSingles(columns.u, 1, list, samples.u);
  takeSingles(columns.v, 1, list, samples.v);
  takeSingles(columns.ax, 1, list, samples.ax);
  takeSingles(columns.ay, 1, list, samples.ay);
  takeSingles(positionRoot, sx, list, samples.xSe);
  takeSingles(positionRoot, sy, list, samples.ySe);
  takeSingles(velocityRoot, sx, list, samples.uSe);
  takeSingles(velocityRoot, sy, list, samples.vSe);
  takeSingles(accelerationRoot, sx, list, samples.axSe);
  takeSingles(accelerationRoot, sy, list, samples.aySe);
  takeSingles(columns.linkRisk, 1, list, samples.linkRisk);
  if (held.dims === 3) {
    takeDoubles(columns.pz, list, samples.z);
    takeDoubles(columns.z, list, samples.measuredZ);
    takeSingles(columns.w, 1, list, samples.w);
    takeSingles(columns.az, 1, list, samples.az);
    takeSingles(positionRoot, sz, list, samples.zSe);
    takeSingles(velocityRoot, sz, list, samples.wSe);
    takeSingles(accelerationRoot, sz, list, samples.azSe);
  }
  takeFlags(held, parameters, list, samples);
  return samples;
}

/** `into[s] = from[list[s]]`. */
function takeDoubles(from: Float64Array, list: Int32Array, into: Float64Array): void {
  for (let s = 0; s < into.length; s++) into[s] = from[list[s]!]!;
}

/** `into[s] = factor from[list[s]]`; NaN of any sign or payload becomes the one that results carry. */
function takeSingles(from: Float32Array, factor: number, list: Int32Array, into: Float32Array): void {
  for (let s = 0; s < into.length; s++) {
    const value = factor * from[list[s]!]!;
    into[s] = Number.isNaN(value) ? NAN : value;
  }
}

function takeFlags(held: HeldFrames, parameters: FitParameters, list: Int32Array, samples: SampleBlock): void {
  const { marks, flags } = held.columns;
  const { bodies, rim } = parameters;
  const into = samples.flags;
  for (let s = 0; s < into.length; s++) {
    const row = list[s]!;
    const mark = marks[row]!;
    let set = flags[row]!;
    if ((mark & (MARK.offFit | MARK.restsOnOff)) !== 0) set |= FLAG['off-fit'];
    if ((mark & MARK.offNeighbours) !== 0) set |= FLAG['off-neighbours'];
    into[s] = set;
  }
  if (bodies.length === 0) return;
  for (let s = 0; s < into.length; s++) into[s] = into[s]! | atBody(bodies, rim, samples.x[s]!, samples.y[s]!);
}
