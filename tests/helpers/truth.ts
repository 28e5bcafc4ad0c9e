import type { DetectionBlock } from '@wakeloom/tracker';
import { evenNumbers, type MotionOptions, type TrueMotion, trueMotion } from './true-motion';

/** What the detection software makes of the particles in view. */
export interface Detecting {
  readonly lossShare?: number;
  /** False detections of a frame over perFrame. */
  readonly ghostShare?: number;
  /** Standard deviation of the noise per axis, length unit. */
  readonly noise?: number | readonly number[];
  readonly perFrame: number;
  readonly box: readonly (readonly [number, number])[];
  readonly seed: number;
}

export interface TruthOptions extends MotionOptions, Detecting {}

/** Detections of all frames, frame after frame; rows of frame k are offsets[k] .. offsets[k + 1]. */
export interface DetectedDump {
  readonly dims: 2 | 3;
  readonly number: Int32Array;
  readonly time: Float64Array;
  readonly offsets: Uint32Array;
  /** As detected, noise included. */
  readonly x: Float64Array;
  readonly y: Float64Array;
  readonly z: Float64Array;
  /** Frame number of each row. */
  readonly frame: Int32Array;
  /** True particle of each row, -1 for a false detection. */
  readonly particle: Int32Array;
  /** Row of the true motion that each row shows, -1 for a false detection. */
  readonly source: Int32Array;
}

/** A dump that knows the truth of each row. */
export interface TruthDump extends DetectedDump {
  /** True position and velocity of each row (NaN for a false detection), three numbers a row. */
  readonly truePosition: Float64Array;
  readonly trueVelocity: Float64Array;
}

/** A dump with its truth, in the length unit of the flow, y up. Rows within a frame are in random order. */
export function truthDump(options: TruthOptions): TruthDump {
  const motion = trueMotion(options);
  const dump = detect(motion, options);
  const rows = dump.x.length;
  const truePosition = new Float64Array(3 * rows).fill(Number.NaN);
  const trueVelocity = new Float64Array(3 * rows).fill(Number.NaN);
  const velocity = new Float64Array(3);
  for (let row = 0; row < rows; row++) {
    const from = dump.source[row];
    if (from < 0) continue;
    const place = [motion.x[from], motion.y[from], motion.dims === 3 ? motion.z[from] : 0] as const;
    options.flow.velocity(place[0], place[1], place[2], dump.time[dump.frame[row]], velocity);
    truePosition.set(place, 3 * row);
    trueVelocity.set(velocity, 3 * row);
  }
  return { ...dump, truePosition, trueVelocity };
}

/** Detections of a true motion: some are lost, all are noisy, false ones lie anywhere; rows of a frame in random order. */
export function detect(motion: TrueMotion, options: Detecting): DetectedDump {
  const { lossShare = 0, ghostShare = 0, noise = 0, box } = options;
  const { dims } = motion;
  const even = evenNumbers(options.seed, 'detections');
  const bell = () => Math.sqrt(-2 * Math.log(1 - even())) * Math.cos(2 * Math.PI * even());
  const spread = box.map((_, axis) => (typeof noise === 'number' ? noise : noise[axis]));
  const frames = motion.time.length;
  const ghosts = Math.round(ghostShare * options.perFrame);
  const most = motion.particle.length + frames * ghosts;
  const seen = [new Float64Array(most), new Float64Array(most), new Float64Array(dims === 3 ? most : 0)];
  const frame = new Int32Array(most);
  const source = new Int32Array(most);
  const offsets = new Uint32Array(frames + 1);
  const truth = [motion.x, motion.y, motion.z];
  let rows = 0;
  for (let k = 0; k < frames; k++) {
    for (let from = motion.offsets[k]; from < motion.offsets[k + 1]; from++) {
      const lost = even() < lossShare;
      for (let axis = 0; axis < dims; axis++) {
        seen[axis][rows] = truth[axis][from] + (spread[axis] > 0 ? spread[axis] * bell() : 0);
      }
      if (!lost) source[rows++] = from;
    }
    for (let g = 0; g < ghosts; g++) {
      for (const [axis, [low, high]] of box.entries()) seen[axis][rows] = low + (high - low) * even();
      source[rows++] = -1;
    }
    for (let i = rows - 1; i > offsets[k]; i--) {
      const j = offsets[k] + Math.floor(even() * (i - offsets[k] + 1));
      for (let axis = 0; axis < dims; axis++) swap(seen[axis], i, j);
      swap(source, i, j);
    }
    frame.fill(k, offsets[k], rows);
    offsets[k + 1] = rows;
  }
  const shown = source.slice(0, rows);
  return {
    dims,
    number: Int32Array.from({ length: frames }, (_, k) => k),
    time: motion.time,
    offsets,
    x: seen[0].slice(0, rows),
    y: seen[1].slice(0, rows),
    z: seen[2].slice(0, dims === 3 ? rows : 0),
    frame: frame.slice(0, rows),
    particle: shown.map((from) => (from < 0 ? -1 : motion.particle[from])),
    source: shown,
  };
}

/** Frames `from` .. `to - 1` of a dump as the block a reader and the calibration would hand on; `row` counts all rows. */
export function truthBlock(dump: DetectedDump, from = 0, to = dump.number.length): DetectionBlock {
  const start = dump.offsets[from];
  const end = dump.offsets[to];
  return {
    dims: dump.dims,
    number: dump.number.slice(from, to),
    time: dump.time.slice(from, to),
    segment: new Int32Array(to - from),
    offsets: dump.offsets.slice(from, to + 1).map((offset) => offset - start),
    x: dump.x.slice(start, end),
    y: dump.y.slice(start, end),
    z: dump.dims === 3 ? dump.z.slice(start, end) : new Float64Array(0),
    brightness: new Float32Array(0),
    row: Float64Array.from({ length: end - start }, (_, k) => start + k),
    given: new Int32Array(0),
  };
}

function swap(column: Float64Array | Int32Array, i: number, j: number): void {
  const kept = column[i];
  column[i] = column[j];
  column[j] = kept;
}
