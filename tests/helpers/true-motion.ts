/**
 * Truth for tests of linking and kinematics: particles moved through a flow by code of its own, apart from the
 * generator in the library. Another integrator (Dormand & Prince, fifth order, a much finer step) and another way
 * of letting particles in (traced back from inside the view), so that a fault of one does not hide in the other.
 */
import { seedFor } from '@wakeloom/tracker/core/context';
import type { Flow } from '@wakeloom/tracker/synthesis/flow';
import { uniformFloat64 } from 'pure-rand/distribution/uniformFloat64';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';

/** J. R. Dormand & P. J. Prince, J. Comput. Appl. Math. 6 (1980) 19-26, the fifth-order solution. */
const NODES = Float64Array.of(0, 1 / 5, 3 / 10, 4 / 5, 8 / 9, 1);
const COUNT = NODES.length;
/** Row s holds the weights of stages 0 .. s - 1, COUNT numbers a row. */
const STAGES = new Float64Array(COUNT * COUNT);
for (const [stage, weights] of [
  [],
  [1 / 5],
  [3 / 40, 9 / 40],
  [44 / 45, -56 / 15, 32 / 9],
  [19372 / 6561, -25360 / 2187, 64448 / 6561, -212 / 729],
  [9017 / 3168, -355 / 33, 46732 / 5247, 49 / 176, -5103 / 18656],
].entries()) {
  STAGES.set(weights, stage * COUNT);
}
const WEIGHTS = Float64Array.of(35 / 384, 0, 500 / 1113, 125 / 192, -2187 / 6784, 11 / 84);

/** Moves particles through one flow. Holds scratch: one object a user. */
export class Carrier {
  private readonly flow: Flow;
  private readonly slope = new Float64Array(3);
  private readonly slopes = new Float64Array(3 * COUNT);

  constructor(flow: Flow) {
    this.flow = flow;
  }

  /** Moves `place` [3] from time `from` to time `to` (either direction) in `steps` equal steps. */
  move(place: Float64Array, from: number, to: number, steps: number): void {
    const { flow, slope, slopes } = this;
    const h = (to - from) / steps;
    for (let step = 0; step < steps; step++) {
      const t = from + step * h;
      for (let stage = 0; stage < COUNT; stage++) {
        let x = 0;
        let y = 0;
        let z = 0;
        for (let k = 0; k < stage; k++) {
          const weight = STAGES[stage * COUNT + k];
          x += weight * slopes[3 * k];
          y += weight * slopes[3 * k + 1];
          z += weight * slopes[3 * k + 2];
        }
        flow.velocity(place[0] + h * x, place[1] + h * y, place[2] + h * z, t + NODES[stage] * h, slope);
        slopes[3 * stage] = slope[0];
        slopes[3 * stage + 1] = slope[1];
        slopes[3 * stage + 2] = slope[2];
      }
      for (let axis = 0; axis < 3; axis++) {
        let sum = 0;
        for (let k = 0; k < COUNT; k++) sum += WEIGHTS[k] * slopes[3 * k + axis];
        place[axis] += h * sum;
      }
    }
    // A place that is no number lies outside every box: it would vanish without a word.
    if (!Number.isFinite(place[0] + place[1] + place[2])) {
      throw new Error(`${flow.name}: got the place ${place.join(', ')} at time ${to}, expected finite numbers`);
    }
  }
}

/** Position at time `to` of the particle at `start` at time `from` (either direction), in `steps` equal steps. */
export function carry(flow: Flow, start: readonly number[], from: number, to: number, steps: number): number[] {
  const place = Float64Array.of(start[0], start[1], flow.dims === 3 ? start[2] : 0);
  new Carrier(flow).move(place, from, to, steps);
  return [...place.subarray(0, flow.dims)];
}

export interface MotionOptions {
  readonly flow: Flow;
  readonly frames: number;
  /** Frames per s. */
  readonly rate: number;
  /** Mean particles in the box in one frame. */
  readonly perFrame: number;
  /** Lower and upper bound of each axis, length unit of the flow, y up. */
  readonly box: readonly (readonly [number, number])[];
  /** Mean frames a particle stays in the light sheet (geometric); default: for ever. */
  readonly stayFrames?: number;
  readonly seed: number;
  /** Integration steps a frame interval; default 20. */
  readonly steps?: number;
  readonly startTime?: number;
}

/** Where the particles in view are, frame after frame; those of frame k are offsets[k] .. offsets[k + 1] - 1. */
export interface TrueMotion {
  readonly dims: 2 | 3;
  readonly time: Float64Array;
  readonly offsets: Uint32Array;
  readonly x: Float64Array;
  readonly y: Float64Array;
  /** Empty in the plane. */
  readonly z: Float64Array;
  readonly particle: Int32Array;
}

/** Numbers in [0, 1) that belong to a seed and a label. */
export function evenNumbers(seed: number, label: string): () => number {
  const generator = xoroshiro128plus(seedFor(seed, label) | 0);
  return () => uniformFloat64(generator);
}

/** Who was within this many times the interval's largest displacement of the border may have come in through it. */
const BORDER = 1.5;

/** Moves an even population through the flow; who leaves the box is replaced by who comes in with the fluid. */
export function trueMotion(options: MotionOptions): TrueMotion {
  const { flow, frames, rate, box, perFrame, steps = 20, startTime = 0 } = options;
  const { dims } = flow;
  const even = evenNumbers(options.seed, 'true motion');
  const carrier = new Carrier(flow);
  const survive = options.stayFrames === undefined ? 1 : 1 - 1 / options.stayFrames;
  const time = Float64Array.from({ length: frames }, (_, k) => startTime + k / rate);
  const place = new Float64Array(3);
  const largest = new Float64Array(3);
  const within = () => box.every(([low, high], axis) => place[axis] >= low && place[axis] < high);
  const solid = () => flow.inside?.(place[0], place[1], place[2]) ?? false;
  const drawInFluid = () => {
    do for (const [axis, [low, high]] of box.entries()) place[axis] = low + (high - low) * even();
    while (solid());
  };
  const farFromBorder = () =>
    box.every(([low, high], axis) => Math.min(place[axis] - low, high - place[axis]) > BORDER * largest[axis]);

  let next = 0;
  let population: Population = { count: 0, at: new Float64Array(3 * perFrame), particle: new Int32Array(perFrame) };
  for (let n = 0; n < perFrame; n++) {
    drawInFluid();
    add(population, place, next++);
  }
  const kept: Population[] = [population];
  for (let k = 1; k < frames; k++) {
    const moved: Population = {
      count: 0,
      at: new Float64Array(3 * (population.count + 64)),
      particle: new Int32Array(population.count + 64),
    };
    let gone = 0;
    largest.fill(0);
    for (let n = 0; n < population.count; n++) {
      const from = population.at.subarray(3 * n, 3 * n + 3);
      place.set(from);
      carrier.move(place, time[k - 1], time[k], steps);
      for (let axis = 0; axis < dims; axis++) {
        largest[axis] = Math.max(largest[axis], Math.abs(place[axis] - from[axis]));
      }
      if (!within()) continue;
      if (solid() || even() >= survive) gone++;
      else add(moved, place, population.particle[n]);
    }
    // Who is in the box now and was outside one interval ago has come in; a whole population is tried for it.
    const now = new Float64Array(3);
    for (let trial = 0; trial < perFrame; trial++) {
      drawInFluid();
      if (farFromBorder()) continue;
      now.set(place);
      carrier.move(place, time[k], time[k - 1], steps);
      if (!within()) add(moved, now, next++);
    }
    while (gone-- > 0) {
      drawInFluid();
      add(moved, place, next++);
    }
    population = moved;
    kept.push(population);
  }
  return inColumns(kept, time, dims);
}

/** Steps a frame interval for which twice as many move no particle of a sample by more than `tolerance`. */
export function enoughSteps(options: MotionOptions, fewest: number, tolerance: number): number {
  const { flow, box, rate, frames, startTime = 0 } = options;
  const even = evenNumbers(options.seed, 'probes');
  const carrier = new Carrier(flow);
  const end = (start: readonly number[], from: number, steps: number) => {
    const place = Float64Array.of(start[0], start[1], start[2] ?? 0);
    carrier.move(place, from, from + 1 / rate, steps);
    return place;
  };
  let steps = fewest;
  for (let probe = 0; probe < 400; probe++) {
    const start = box.map(([low, high]) => low + (high - low) * even());
    const from = startTime + Math.floor(frames * even()) / rate;
    if (flow.inside?.(start[0], start[1], start[2] ?? 0)) continue;
    for (; ; steps *= 2) {
      const coarse = end(start, from, steps);
      const fine = end(start, from, 2 * steps);
      if (Math.hypot(fine[0] - coarse[0], fine[1] - coarse[1], fine[2] - coarse[2]) <= tolerance) break;
      if (steps > 1000) throw new Error(`${flow.name}: no number of steps up to 1000 reaches ${tolerance}`);
    }
  }
  return steps;
}

interface Population {
  count: number;
  /** Three numbers a particle. */
  at: Float64Array;
  particle: Int32Array;
}

function add(population: Population, place: Float64Array, particle: number): void {
  if (population.count === population.particle.length) {
    const size = 2 * population.count + 64;
    const at = new Float64Array(3 * size);
    at.set(population.at);
    population.at = at;
    const particles = new Int32Array(size);
    particles.set(population.particle);
    population.particle = particles;
  }
  population.at.set(place, 3 * population.count);
  population.particle[population.count++] = particle;
}

function inColumns(frames: readonly Population[], time: Float64Array, dims: 2 | 3): TrueMotion {
  const offsets = new Uint32Array(frames.length + 1);
  for (const [k, { count }] of frames.entries()) offsets[k + 1] = offsets[k] + count;
  const rows = offsets[frames.length];
  const x = new Float64Array(rows);
  const y = new Float64Array(rows);
  const z = new Float64Array(dims === 3 ? rows : 0);
  const particle = new Int32Array(rows);
  let row = 0;
  for (const population of frames) {
    for (let n = 0; n < population.count; n++, row++) {
      x[row] = population.at[3 * n];
      y[row] = population.at[3 * n + 1];
      if (dims === 3) z[row] = population.at[3 * n + 2];
      particle[row] = population.particle[n];
    }
  }
  return { dims, time, offsets, x, y, z, particle };
}
