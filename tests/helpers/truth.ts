/**
 * Truth for tests of linking and kinematics: particles moved through a flow by code of its own, apart from the
 * generator in the library. Another integrator (Dormand & Prince, fifth order, a much finer step) and another way
 * of letting particles in (traced back from inside the view), so that a fault of one does not hide in the other.
 */
import type { DetectionBlock } from '@wakeloom/tracker';
import type { Flow } from '@wakeloom/tracker/synthesis/flow';
import { uniformFloat64 } from 'pure-rand/distribution/uniformFloat64';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';

/** J. R. Dormand & P. J. Prince, J. Comput. Appl. Math. 6 (1980) 19-26, the fifth-order solution. */
const NODES = [0, 1 / 5, 3 / 10, 4 / 5, 8 / 9, 1];
const STAGES = [
  [],
  [1 / 5],
  [3 / 40, 9 / 40],
  [44 / 45, -56 / 15, 32 / 9],
  [19372 / 6561, -25360 / 2187, 64448 / 6561, -212 / 729],
  [9017 / 3168, -355 / 33, 46732 / 5247, 49 / 176, -5103 / 18656],
];
const WEIGHTS = [35 / 384, 0, 500 / 1113, 125 / 192, -2187 / 6784, 11 / 84];

/** Position at time `to` of the particle at `start` at time `from` (either direction), in `steps` equal steps. */
export function carry(flow: Flow, start: readonly number[], from: number, to: number, steps: number): number[] {
  const h = (to - from) / steps;
  const dims = flow.dims;
  const place = [start[0], start[1], dims === 3 ? start[2] : 0];
  const slopes = NODES.map(() => new Float64Array(3));
  const probe = [0, 0, 0];
  for (let step = 0; step < steps; step++) {
    const t = from + step * h;
    for (let stage = 0; stage < NODES.length; stage++) {
      for (let axis = 0; axis < dims; axis++) {
        let sum = 0;
        for (let k = 0; k < stage; k++) sum += STAGES[stage][k] * slopes[k][axis];
        probe[axis] = place[axis] + h * sum;
      }
      flow.velocity(probe[0], probe[1], probe[2], t + NODES[stage] * h, slopes[stage]);
    }
    for (let axis = 0; axis < dims; axis++) {
      let sum = 0;
      for (let k = 0; k < NODES.length; k++) sum += WEIGHTS[k] * slopes[k][axis];
      place[axis] += h * sum;
    }
  }
  return place.slice(0, dims);
}

export interface TruthOptions {
  readonly flow: Flow;
  readonly frames: number;
  /** Frames per s. */
  readonly rate: number;
  /** Mean particles in the box in one frame. */
  readonly perFrame: number;
  /** Lower and upper bound of each axis, length unit of the flow, y up. */
  readonly box: readonly (readonly [number, number])[];
  readonly lossShare?: number;
  /** False detections of a frame over perFrame. */
  readonly ghostShare?: number;
  /** Standard deviation of the noise per axis, length unit. */
  readonly noise?: number | readonly number[];
  /** Mean frames a particle stays in the light sheet (geometric); default: for ever. */
  readonly stayFrames?: number;
  readonly seed: number;
  /** Integration steps a frame interval; default 20. */
  readonly steps?: number;
  readonly startTime?: number;
}

/** Detections of all frames, frame after frame; rows of frame k are offsets[k] .. offsets[k + 1]. */
export interface TruthDump {
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
  /** True position and velocity of each row (NaN for a false detection), three numbers a row. */
  readonly truePosition: Float64Array;
  readonly trueVelocity: Float64Array;
}

/** A dump with its truth, in the length unit of the flow, y up. Rows within a frame are in random order. */
export function truthDump(options: TruthOptions): TruthDump {
  const { flow, frames, rate, box, lossShare = 0, ghostShare = 0, noise = 0, steps = 20, startTime = 0 } = options;
  const dims = flow.dims;
  const generator = xoroshiro128plus(options.seed);
  const even = () => uniformFloat64(generator);
  const bell = () => Math.sqrt(-2 * Math.log(1 - even())) * Math.cos(2 * Math.PI * even());
  const within = (p: readonly number[]) => box.every(([low, high], axis) => p[axis] >= low && p[axis] < high);
  const solid = (p: readonly number[]) => flow.inside?.(p[0], p[1], p[2] ?? 0) ?? false;
  const anywhere = () => box.map(([low, high]) => low + (high - low) * even());
  const inFluid = () => {
    let p = anywhere();
    while (solid(p)) p = anywhere();
    return p;
  };
  const spread = (axis: number) => (typeof noise === 'number' ? noise : noise[axis]);
  const survive = options.stayFrames === undefined ? 1 : 1 - 1 / options.stayFrames;

  let next = 0;
  let alive = Array.from({ length: options.perFrame }, () => ({ id: next++, at: inFluid() }));
  const columns = { x: [], y: [], z: [], frame: [], particle: [], position: [], velocity: [] } as Record<
    string,
    number[]
  >;
  const offsets = [0];
  const number = Int32Array.from({ length: frames }, (_, k) => k);
  const time = Float64Array.from({ length: frames }, (_, k) => startTime + k / rate);
  const velocity = new Float64Array(3);
  for (let k = 0; k < frames; k++) {
    if (k > 0) {
      const moved = [];
      let gone = 0;
      for (const { id, at } of alive) {
        const to = carry(flow, at, time[k - 1], time[k], steps);
        if (!within(to)) continue;
        if (solid(to) || even() >= survive) gone++;
        else moved.push({ id, at: to });
      }
      // Who is in the box now and was outside one interval ago has come in; a whole population is tried for it.
      for (let trial = 0; trial < options.perFrame; trial++) {
        const at = inFluid();
        if (!within(carry(flow, at, time[k], time[k - 1], steps))) moved.push({ id: next++, at });
      }
      while (gone-- > 0) moved.push({ id: next++, at: inFluid() });
      alive = moved;
    }
    const rows: { id: number; at: number[]; seen: number[] }[] = [];
    for (const { id, at } of alive) {
      const lost = even() < lossShare;
      const seen = at.map((value, axis) => value + (spread(axis) > 0 ? spread(axis) * bell() : 0));
      if (!lost) rows.push({ id, at, seen });
    }
    for (let g = Math.round(ghostShare * options.perFrame); g > 0; g--) rows.push({ id: -1, at: [], seen: anywhere() });
    for (let i = rows.length - 1; i > 0; i--) {
      const j = Math.floor(even() * (i + 1));
      [rows[i], rows[j]] = [rows[j], rows[i]];
    }
    for (const { id, at, seen } of rows) {
      columns.x.push(seen[0]);
      columns.y.push(seen[1]);
      if (dims === 3) columns.z.push(seen[2]);
      columns.frame.push(k);
      columns.particle.push(id);
      if (id >= 0) flow.velocity(at[0], at[1], at[2] ?? 0, time[k], velocity);
      for (let axis = 0; axis < 3; axis++) {
        columns.position.push(id < 0 ? Number.NaN : (at[axis] ?? 0));
        columns.velocity.push(id < 0 ? Number.NaN : axis < dims ? velocity[axis] : 0);
      }
    }
    offsets.push(columns.x.length);
  }
  return {
    dims,
    number,
    time,
    offsets: Uint32Array.from(offsets),
    x: Float64Array.from(columns.x),
    y: Float64Array.from(columns.y),
    z: Float64Array.from(columns.z),
    frame: Int32Array.from(columns.frame),
    particle: Int32Array.from(columns.particle),
    truePosition: Float64Array.from(columns.position),
    trueVelocity: Float64Array.from(columns.velocity),
  };
}

/** Frames `from` .. `to - 1` of a truth dump as the block a reader and the calibration would hand on; `row` counts all rows. */
export function truthBlock(dump: TruthDump, from = 0, to = dump.number.length): DetectionBlock {
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

export interface LinkScore {
  /** Right links over links made; 1 when none was made. */
  readonly precision: number;
  /** Right links over true links; 1 when there are none. */
  readonly recall: number;
  readonly made: number;
  readonly right: number;
  readonly true: number;
}

/** Fewest detections that make a pathline worth scoring, true or made. */
const FEWEST = 3;

/**
 * Scores pathline numbers (one a detection, negative: left out) against true particles (negative: false
 * detection). A true link joins two successive detections of one particle at most `bridge` + 1 frames apart, in a
 * run of at least three detections so joined. A made link joins two successive detections of one pathline of at
 * least three; it is right when it is a true link. All arrays have one entry a detection, in any order.
 */
export function scoreLinks(
  pathline: ArrayLike<number>,
  particle: ArrayLike<number>,
  frame: ArrayLike<number>,
  bridge: number,
): LinkScore {
  const truth = new Set<string>();
  for (const chain of chains(particle, frame)) {
    let run: number[] = [];
    const close = () => {
      if (run.length >= FEWEST) for (let k = 1; k < run.length; k++) truth.add(`${run[k - 1]}>${run[k]}`);
      run = [];
    };
    for (const row of chain) {
      if (run.length > 0 && frame[row] - frame[run[run.length - 1]] > bridge + 1) close();
      run.push(row);
    }
    close();
  }
  let made = 0;
  let right = 0;
  for (const chain of chains(pathline, frame)) {
    if (chain.length < FEWEST) continue;
    for (let k = 1; k < chain.length; k++) {
      made++;
      if (truth.has(`${chain[k - 1]}>${chain[k]}`)) right++;
    }
  }
  return {
    precision: made === 0 ? 1 : right / made,
    recall: truth.size === 0 ? 1 : right / truth.size,
    made,
    right,
    true: truth.size,
  };
}

/** Rows of each non-negative label, in order of frame. */
function chains(label: ArrayLike<number>, frame: ArrayLike<number>): number[][] {
  const byLabel = new Map<number, number[]>();
  for (let row = 0; row < label.length; row++) {
    if (label[row] < 0) continue;
    const chain = byLabel.get(label[row]);
    if (chain === undefined) byLabel.set(label[row], [row]);
    else chain.push(row);
  }
  for (const chain of byLabel.values()) chain.sort((a, b) => frame[a] - frame[b] || a - b);
  return [...byLabel.values()];
}
