import type { DetectionBlock, Dims } from '../core/columns.js';
import { CellIndex } from '../math/cell-index.js';
import { medianInPlace, SIGMA_PER_MEDIAN } from '../math/median.js';

/** A place in space that holds a detection in most frames: dirt on a window, a reflection, a particle stuck to a wall. */
export interface StuckPlace {
  readonly at: readonly [number, number, number];
  /** How far from it its detections lie at most, per axis, length unit. */
  readonly radius: readonly [number, number, number];
  /** Time over which it was seen. */
  readonly seen: number;
}

/** Share of the frames that a place must be occupied in: specks blink, passing particles are gone in a few frames. */
const LEAST_SHARE = 0.6;
/** Frames looked at, at most and at least: over fewer, slow particles cannot be told from specks. */
const MOST_FRAMES = 100;
const FEWEST_FRAMES = 30;
/** Frames whose detections are tried as places: a speck in 60 % of the frames is missed by all of them once in 100. */
const SEED_FRAMES = 5;
/** Frames of the first sieve, and in how many of them a place must be occupied: 1 in 80 of such specks is lost. */
const SIEVE_FRAMES = 10;
const SIEVE_HITS = 3;
/** Detections of the seed frames that may pass the sieve: with more it is the fluid that stands still, not some specks. */
const MOST_SEEDS = 4000;
/** Where hits are gathered, in mean spacings: 12 times the usual noise; chance detections fall there once in 100 frames. */
const GATHER = 0.05;
/** Positions of a place scatter by at most this share of that radius: more is chance. */
const MOST_SCATTER = 1 / 3;
/** Extent of a place in standard deviations of its own scatter, and its least in spacings (noise-free or rounded positions). */
const EXTENT = 4;
const LEAST_RADIUS = 0.004;
/** A drift of the place in so many of its standard errors shows that it is a slow particle. */
const DRIFT = 5;
/** Scatter about the median over that from one frame to the next: what wanders is no speck. */
const WANDER = 2;

/**
 * Places that hold a detection in at least 60 % of the frames and do not drift, among up to 100 frames spread over
 * `blocks` (at least 30, else none is named; nor with more than about 800 of them, when it must be the fluid that is at
 * rest). Such detections vanish as short fragments where they are linked with the prediction of the flow, or drag the mean
 * down where they are not. Slow particles are told by their drift: over n frames one of 5 sqrt(12 / n) noise standard
 * deviations shows; and see `withinFlow`. Specks that come later than the blocks are left to the look at whole pathlines.
 *
 * Deterministic, + - * / sqrt. Memory: the detections of five frames. Cost: about 0.2 us a detection of the frames looked
 * at; `breathe` is awaited between frames.
 */
export async function findStuckPlaces(
  blocks: readonly DetectionBlock[],
  dims: Dims,
  spacing: number,
  depthNoise: number,
  breathe: () => Promise<void> = async () => {},
): Promise<StuckPlace[]> {
  const frames: FramePlace[] = [];
  for (const block of blocks) for (let k = 0; k < block.number.length; k++) frames.push({ block, k });
  const looked = spread(frames, MOST_FRAMES);
  if (looked.length < FEWEST_FRAMES) return [];
  const gather: [number, number, number] = [GATHER * spacing, GATHER * spacing, GATHER * spacing * depthNoise];
  const search = new CellIndex();
  let near = new Int32Array(0);
  /** Row of the detection nearest to a place in the frame the search was built on, -1 for none. */
  const nearest = (block: DetectionBlock, x: number, y: number, z: number): number => {
    const found = search.near(x, y, z, near);
    let best = -1;
    let least = Number.POSITIVE_INFINITY;
    for (let n = 0; n < found; n++) {
      const row = near[n];
      const dx = (block.x[row] - x) / gather[0];
      const dy = (block.y[row] - y) / gather[1];
      const dz = dims === 3 ? (block.z[row] - z) / gather[2] : 0;
      const square = dx * dx + dy * dy + dz * dz;
      if (square < least) {
        least = square;
        best = row;
      }
    }
    return best;
  };
  const open = ({ block, k }: FramePlace) => {
    const rows = block.offsets[k + 1] - block.offsets[k];
    if (near.length < rows) near = new Int32Array(rows);
    search.build(block, block.offsets[k], block.offsets[k + 1], dims, gather);
  };

  let seeds: (readonly [number, number, number])[] = [];
  for (const { block, k } of spread(looked, SEED_FRAMES)) {
    for (let row = block.offsets[k]; row < block.offsets[k + 1]; row++) {
      seeds.push([block.x[row], block.y[row], dims === 3 ? block.z[row] : 0]);
    }
  }
  const hits = new Uint8Array(seeds.length);
  for (const frame of spread(looked, SIEVE_FRAMES)) {
    open(frame);
    for (const [s, [x, y, z]] of seeds.entries()) if (nearest(frame.block, x, y, z) >= 0) hits[s]++;
    await breathe();
  }
  seeds = seeds.filter((_, s) => hits[s] >= SIEVE_HITS);
  if (seeds.length > MOST_SEEDS) return [];
  // One seed a place: the others of the same speck lie within the radius in which hits are gathered.
  seeds = seeds.filter(
    (seed, s) =>
      !seeds.slice(0, s).some((other) => seed.every((x, axis) => Math.abs(x - other[axis]) <= gather[axis] / 2)),
  );
  const seen = seeds.map(() => ({ time: [] as number[], at: [[], [], []] as [number[], number[], number[]] }));
  for (const frame of looked) {
    const { block, k } = frame;
    open(frame);
    for (const [s, [x, y, z]] of seeds.entries()) {
      const row = nearest(block, x, y, z);
      if (row < 0) continue;
      seen[s].time.push(block.time[k]);
      seen[s].at[0].push(block.x[row]);
      seen[s].at[1].push(block.y[row]);
      seen[s].at[2].push(dims === 3 ? block.z[row] : 0);
    }
    await breathe();
  }
  const places: StuckPlace[] = [];
  for (const { time, at } of seen) {
    const place = judge(time, at, dims, looked.length, gather, spacing, depthNoise);
    if (place === null) continue;
    const known = places.some((other) => other.at.every((x, axis) => Math.abs(x - place.at[axis]) <= gather[axis] / 2));
    if (!known) places.push(place);
  }
  return places;
}

/**
 * The places whose detections cannot be particles of the flow: in the time they were seen the flow there would have
 * carried one many times their size away. In fluid at rest a speck and a tracer look the same, and do the same to a mean.
 * `speedAt`: speed of the flow at a place.
 */
export function withinFlow(
  places: readonly StuckPlace[],
  speedAt: (x: number, y: number, z: number) => number,
): StuckPlace[] {
  return places.filter(({ at, radius, seen }) => speedAt(at[0], at[1], at[2]) * seen >= CARRIED * radius[0]);
}

/** Times the radius of a place that the flow must carry a particle past while the place was seen. */
const CARRIED = 5;

interface FramePlace {
  readonly block: DetectionBlock;
  readonly k: number;
}

/** Up to `most` of them, evenly spread. */
function spread<T>(all: readonly T[], most: number): T[] {
  if (all.length <= most) return [...all];
  return Array.from({ length: most }, (_, i) => all[Math.trunc((i * (all.length - 1)) / (most - 1))]);
}

/** Whether positions at times are those of a thing that does not move, in enough of `frames` frames. */
function judge(
  time: readonly number[],
  at: readonly [readonly number[], readonly number[], readonly number[]],
  dims: Dims,
  frames: number,
  gather: readonly number[],
  spacing: number,
  depthNoise: number,
): StuckPlace | null {
  const n = time.length;
  if (n < LEAST_SHARE * frames) return null;
  const centre: [number, number, number] = [0, 0, 0];
  const radius: [number, number, number] = [0, 0, 0];
  const scratch = new Float64Array(n);
  const mean = time.reduce((sum, t) => sum + t, 0) / n;
  const timeSquares = time.reduce((sum, t) => sum + (t - mean) * (t - mean), 0);
  // One scatter for both axes of the plane: from 60 differences along one alone it would be good to 15 % only.
  const inPlane = scatterOf([at[0], at[1]]);
  for (let axis = 0; axis < dims; axis++) {
    const values = at[axis];
    for (let i = 0; i < n; i++) scratch[i] = values[i];
    centre[axis] = medianInPlace(scratch, n);
    for (let i = 0; i < n; i++) scratch[i] = Math.abs(values[i] - centre[axis]);
    const about = SIGMA_PER_MEDIAN * medianInPlace(scratch, n);
    const scatter = axis === 2 ? scatterOf([at[2]]) : inPlane;
    const least = LEAST_RADIUS * spacing * (axis === 2 ? depthNoise : 1);
    if (scatter > MOST_SCATTER * gather[axis] || about > Math.max(WANDER * scatter, least / EXTENT)) return null;
    radius[axis] = Math.max(EXTENT * scatter, least);
    let slope = 0;
    let used = 0;
    for (let i = 0; i < n; i++) {
      const off = values[i] - centre[axis];
      // A particle that passes by is no drift of the place.
      if (Math.abs(off) > radius[axis]) continue;
      slope += (time[i] - mean) * off;
      used++;
    }
    if (used < LEAST_SHARE * frames) return null;
    if (Math.abs(slope) > DRIFT * Math.max(scatter, least / EXTENT) * Math.sqrt(timeSquares)) return null;
  }
  return { at: centre, radius, seen: time[n - 1] - time[0] };
}

/** Standard deviation of white noise on values, from the median of differences of successive ones: a drift does not show. */
function scatterOf(columns: readonly (readonly number[])[]): number {
  const sizes: number[] = [];
  for (const values of columns) for (let i = 1; i < values.length; i++) sizes.push(Math.abs(values[i] - values[i - 1]));
  return (SIGMA_PER_MEDIAN * medianInPlace(Float64Array.from(sizes), sizes.length)) / Math.SQRT2;
}
