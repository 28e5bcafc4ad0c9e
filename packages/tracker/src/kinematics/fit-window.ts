import type { LinkedBlock, SampleBlock } from '../core/columns.js';
import { createFrameFit } from './create-frame-fit.js';
import type { FitParameters } from './fit-parameters.js';
import { sampleColumns } from './sample-columns.js';

/** Frame indices `from .. to - 1` of a window whose samples are wanted. */
export interface CoreRange {
  readonly from: number;
  readonly to: number;
}

/**
 * Fits and screens linked detections that are all at hand, and gives the samples of the frames of `core`: every
 * detection there that has a pathline, in the order of rows. The same as from a run in which the frames before and
 * behind the window were present where `fitLag(parameters)` frames lie on either side of the core. Pure; the window is
 * borrowed, the samples are new.
 */
export function fitWindow(window: LinkedBlock, core: CoreRange, parameters: FitParameters): SampleBlock {
  const steps = fitWindowInSteps(window, core, parameters);
  for (;;) {
    const step = steps.next();
    if (step.done) return step.value;
  }
}

/** `fitWindow` in steps of a few ms each, for callers that must look at messages in between. */
export function* fitWindowInSteps(
  window: LinkedBlock,
  core: CoreRange,
  parameters: FitParameters,
): Generator<void, SampleBlock> {
  const wanted = new Set(window.number.subarray(core.from, core.to));
  const fit = createFrameFit(parameters);
  const pieces: SampleBlock[] = [];
  for (const steps of [fit.add(window), fit.finish()]) {
    for (const samples of steps) {
      if (samples === null) yield;
      else pieces.push(samples);
    }
  }
  return framesOf(pieces, wanted, window.dims);
}

/** The samples of these frames from successive blocks, as one block. */
function framesOf(pieces: readonly SampleBlock[], wanted: ReadonlySet<number>, dims: LinkedBlock['dims']): SampleBlock {
  const parts = pieces.flatMap((piece) =>
    Array.from(piece.number, (number, k) => ({ piece, k, number })).filter(({ number }) => wanted.has(number)),
  );
  const offsets = new Uint32Array(parts.length + 1);
  for (const [n, { piece, k }] of parts.entries()) {
    offsets[n + 1] = offsets[n]! + piece.offsets[k + 1]! - piece.offsets[k]!;
  }
  const samples = sampleColumns(dims, offsets[parts.length]!, {
    number: Int32Array.from(parts, ({ number }) => number),
    time: Float64Array.from(parts, ({ piece, k }) => piece.time[k]!),
    segment: Int32Array.from(parts, ({ piece, k }) => piece.segment[k]!),
    offsets,
  });
  const { number: _n, time: _t, segment: _s, offsets: _o, dims: _d, ...columns } = samples;
  for (const [name, column] of Object.entries(columns) as [keyof typeof columns, Float64Array][]) {
    if (column.length === 0) continue;
    for (const [n, { piece, k }] of parts.entries()) {
      column.set(piece[name].subarray(piece.offsets[k]!, piece.offsets[k + 1]!), offsets[n]!);
    }
  }
  return samples;
}
