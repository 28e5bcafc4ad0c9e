import type { SynthesisOptions, SyntheticFrame } from './make-dump.js';
import type { ParticleCloud } from './particle-cloud.js';
import type { RandomStream } from './random-stream.js';

/** One stream for each thing that is left to chance, so that changing one share leaves the other draws alone. */
export interface ObservationDraws {
  readonly loss: RandomStream;
  readonly noise: RandomStream;
  readonly ghosts: RandomStream;
  readonly brightness: RandomStream;
}

/** Spread of brightness between particles and between the frames of one (invented, plausible). */
const PARTICLE_SPREAD = 0.35;
const FRAME_SPREAD = 0.1;
/** False detections are fainter than particles on average (invented). */
const GHOST_BRIGHTNESS = 0.5;

/**
 * What a camera and its detection make of the cloud at this instant: px coordinates with y down, noise, losses,
 * false detections, raster order. A particle counts as in view by its true position; noise may push its
 * detection over the edge of the view, which then is no detection.
 */
export function observeFrame(
  number: number,
  cloud: ParticleCloud,
  options: SynthesisOptions,
  draws: ObservationDraws,
): SyntheticFrame {
  const { flow, region, scale, noisePx, brightness = 120 } = options;
  const space = flow.dims === 3;
  const noise = (axis: number) => (typeof noisePx === 'number' ? noisePx : (noisePx[axis] ?? noisePx[0]));
  const size = [region.x, region.y, region.z ?? [0, 0]].map(([from, to]) => (to - from) / scale);
  const ghosts = draws.ghosts.poisson(options.ghostShare * options.perFrame);
  const capacity = cloud.count + ghosts;
  const columns = [new Float64Array(capacity), new Float64Array(capacity), new Float64Array(space ? capacity : 0)];
  const light = new Float32Array(brightness > 0 ? capacity : 0);
  const particle = new Int32Array(capacity);
  const place = new Float64Array(3);
  let rows = 0;
  const keep = (identity: number, mean: number) => {
    for (let axis = 0; axis < flow.dims; axis++) columns[axis][rows] = place[axis];
    if (brightness > 0) light[rows] = mean * Math.exp(FRAME_SPREAD * draws.brightness.normal());
    particle[rows++] = identity;
  };
  for (let i = 0; i < cloud.count; i++) {
    place[0] = (cloud.x[i] - region.x[0]) / scale;
    place[1] = (region.y[1] - cloud.y[i]) / scale;
    if (space) place[2] = (cloud.z[i] - region.z![0]) / scale;
    if (!inView(place, size, flow.dims)) continue;
    const lost = draws.loss.uniform() < options.lossShare;
    for (let axis = 0; axis < flow.dims; axis++) place[axis] += noise(axis) * draws.noise.normal();
    if (lost || !inView(place, size, flow.dims)) continue;
    keep(cloud.identity[i], brightness * particleBrightness(cloud.identity[i]));
  }
  for (let g = 0; g < ghosts; g++) {
    for (let axis = 0; axis < flow.dims; axis++) place[axis] = size[axis] * draws.ghosts.uniform();
    keep(-1, GHOST_BRIGHTNESS * brightness);
  }
  const order = rasterOrder(columns[0].subarray(0, rows), columns[1].subarray(0, rows));
  return {
    dims: flow.dims,
    number,
    x: Float64Array.from(order, (row) => columns[0][row]),
    y: Float64Array.from(order, (row) => columns[1][row]),
    z: space ? Float64Array.from(order, (row) => columns[2][row]) : new Float64Array(0),
    brightness: brightness > 0 ? Float32Array.from(order, (row) => light[row]) : new Float32Array(0),
    particle: Int32Array.from(order, (row) => particle[row]),
  };
}

function inView(place: Float64Array, size: readonly number[], dims: number): boolean {
  for (let axis = 0; axis < dims; axis++) if (!(place[axis] >= 0 && place[axis] < size[axis])) return false;
  return true;
}

/** A particle's own brightness over the mean, from its identity: golden-ratio steps are even over [0, 1). */
function particleBrightness(identity: number): number {
  const even = (identity * 0.6180339887498949) % 1;
  return 1 + PARTICLE_SPREAD * (2 * even - 1);
}

function rasterOrder(x: Float64Array, y: Float64Array): Uint32Array {
  const order = new Uint32Array(x.length);
  for (let row = 0; row < order.length; row++) order[row] = row;
  return order.sort((a, b) => Math.floor(y[a]) - Math.floor(y[b]) || x[a] - x[b]);
}
