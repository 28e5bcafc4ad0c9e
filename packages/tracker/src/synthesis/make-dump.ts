import type { Dims } from '../core/columns.js';
import type { Flow } from './flow.js';
import { observeFrame } from './observe-frame.js';
import { ParticleCloud } from './particle-cloud.js';
import { randomStream } from './random-stream.js';

/** Box of the field of view, in the length unit of the flow (mm in the demos). z for 3-D flows only. */
export interface ViewBox {
  readonly x: readonly [number, number];
  readonly y: readonly [number, number];
  readonly z?: readonly [number, number];
}

/** What `synthesise` makes a dump from. */
export interface SynthesisOptions {
  readonly flow: Flow;
  readonly frames: number;
  /** Frames per s. */
  readonly rate: number;
  /** Mean number of particles in view in one frame, before losses. */
  readonly perFrame: number;
  readonly region: ViewBox;
  /** Length per px, the same along every axis. */
  readonly scale: number;
  /** Chance that a particle in view is not detected in a frame, 0 to 1. */
  readonly lossShare: number;
  /** Mean number of false detections in a frame over `perFrame`; they lie evenly over the view. */
  readonly ghostShare: number;
  /** Standard deviation of the position noise, px: one number, or one for each axis. */
  readonly noisePx: number | readonly number[];
  readonly seed: number;
  /** Runge-Kutta steps per frame interval; default 4. */
  readonly substeps?: number;
  /** Mean time a particle spends in the light sheet, s; default infinity (none leaves through the sides). */
  readonly stay?: number;
  /** Mean brightness of a particle, counts; default 120. 0 leaves the column empty. */
  readonly brightness?: number;
  /** Time of the first frame, s; default 0. */
  readonly startTime?: number;
  /** Number of the first frame; default 0. */
  readonly firstFrame?: number;
}

/**
 * One frame of a synthetic dump, in px as a camera writes them: x to the right, y DOWN from the upper edge of the
 * view, both from the corner of the first pixel; z from the near side of the box. Rows stand in raster order (by
 * px row, then x), which tells nothing of the particles. New arrays, the receiver's own.
 */
export interface SyntheticFrame {
  readonly dims: Dims;
  readonly number: number;
  readonly x: Float64Array;
  readonly y: Float64Array;
  /** Empty in the plane. */
  readonly z: Float64Array;
  /** Empty when no brightness was asked for. */
  readonly brightness: Float32Array;
  /** True particle of each row, -1 for a false detection. Never written to a dump. */
  readonly particle: Int32Array;
}

/**
 * Frames of a dump as a tracking experiment in the given flow would leave it. Particles start evenly spread over
 * the view (and a border round it), move with the flow by fourth-order Runge-Kutta, enter from outside at the rate
 * the flow carries them in, leave the light sheet after an exponentially distributed stay and are replaced
 * elsewhere, so that the density stays even and stationary in a divergence-free flow. None lies in a solid. Then
 * losses, position noise and false detections are laid on. The same options give the same numbers on one
 * JavaScript engine (elementary functions are used). Cost: about 1 us a particle and frame for a cheap flow.
 */
export function* synthesise(options: SynthesisOptions): Generator<SyntheticFrame, void, undefined> {
  const cloud = new ParticleCloud(options);
  const draws = {
    loss: randomStream(options.seed, 'loss'),
    noise: randomStream(options.seed, 'noise'),
    ghosts: randomStream(options.seed, 'ghosts'),
    brightness: randomStream(options.seed, 'brightness'),
  };
  for (let k = 0; k < options.frames; k++) {
    if (k > 0) cloud.step();
    yield observeFrame((options.firstFrame ?? 0) + k, cloud, options, draws);
  }
}
