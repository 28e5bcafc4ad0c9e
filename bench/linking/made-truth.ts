import type { DetectionBlock } from '@wakeloom/tracker';
import { seedFor } from '@wakeloom/tracker/core/context';
import { displacementRatio } from '@wakeloom/tracker/synthesis/displacement-ratio';
import type { Flow } from '@wakeloom/tracker/synthesis/flow';
import { enoughSteps, type MotionOptions, type TrueMotion, trueMotion } from '../../tests/helpers/true-motion';
import { detect, truthBlock } from '../../tests/helpers/truth';
import { DEPTH_NOISE, type LinkingCase } from './cases';
import { type FlowCase, flowCase } from './flows';
import { cached, type Places } from './truth-cache';

/** Width of the view, px. */
const WIDTH_PX = 1280;
/** The library's own generator takes four steps of fourth order a frame interval; truth takes more, of fifth order. */
const FEWEST_STEPS = 5;
/** Twice as many steps may move no particle by more than this, px: a hundredth of the least noise is 5e-4. */
const STEP_ERROR_PX = 1e-4;
/** The same for what the oracle predicts: a twentieth of that noise. */
const ORACLE_ERROR_PX = 2.5e-3;
/** Image pairs: time from pair to pair over that within a pair. */
export const PAIRS_APART = 100;
/** Rounds in which the rate is set: an unsteady flow's mean speed depends on how long it is looked at. */
const RATE_ROUNDS = 6;

/** What truth is made of: change one of these files and cached truth is made anew. */
export const TRUTH_SOURCES = [
  'tests/helpers/true-motion.ts',
  'bench/linking/flows.ts',
  'bench/linking/made-truth.ts',
  'packages/tracker/src/synthesis/',
  'data/wake-re150.bin.gz',
];

/** A dump with its truth and all that a linker with or without that truth needs. */
export interface MadeTruth {
  readonly block: DetectionBlock;
  /** Of each row: true particle (negative: false detection) and frame number. */
  readonly particle: Int32Array;
  readonly frame: Int32Array;
  readonly flow: Flow;
  /** Steps a frame interval that carry a particle well enough for a prediction. */
  readonly oracleSteps: number;
  /** Frames (pairs: inverse of the delay) a second. */
  readonly rate: number;
  /** Position noise in the plane, mm. */
  readonly noise: number;
  readonly scale: number;
  /** Mean spacing n^(-1/D) of the particles, mm. */
  readonly spacing: number;
}

/** Makes the dump of a case. The same case gives the same dump; noise, losses and ghosts differ over one true motion. */
export async function madeTruth(one: LinkingCase, places: Places): Promise<MadeTruth> {
  const { flow: name, perFrame, frames, pairs } = one;
  const view = flowCase(name);
  const flow = await view.flow(one.seed, places.root);
  const box = shrunk(view.box, one.side);
  const scale = (view.box[0][1] - view.box[0][0]) / WIDTH_PX;
  const startTime = (view.period ?? 0) * (seedFor(one.seed, `start ${name}`) / 2 ** 32);
  const rate = rateFor(one, box, flow, startTime);
  const seed = seedFor(one.seed, `${name} ${one.ratio} ${perFrame} ${pairs}`) | 0;
  const whole: MotionOptions = { flow, frames, rate, perFrame, box, seed, startTime };
  const steps = enoughSteps(whole, FEWEST_STEPS, STEP_ERROR_PX * scale);
  const key = { name, ratio: one.ratio, flowSeed: one.seed, perFrame, frames, pairs, side: one.side };
  const motion = cached(places, key, TRUTH_SOURCES, () =>
    pairs ? pairMotion({ ...whole, steps }) : columnsOf(trueMotion({ ...whole, steps })),
  );
  const noise = one.noise * scale;
  const dump = detect(
    { ...motion, dims: flow.dims },
    {
      lossShare: one.losses,
      ghostShare: one.ghosts,
      noise: [noise, noise, DEPTH_NOISE * noise],
      perFrame,
      box,
      seed,
    },
  );
  const block = truthBlock(dump);
  if (pairs) for (let k = 0; k < frames; k++) block.segment[k] = k >> 1;
  return {
    block,
    particle: dump.particle,
    frame: dump.frame,
    flow,
    oracleSteps: enoughSteps(whole, 1, ORACLE_ERROR_PX * scale),
    rate,
    noise,
    scale,
    spacing: (room(box, flow) / perFrame) ** (1 / flow.dims),
  };
}

type Box = FlowCase['box'];

/** The middle part of a box, `side` of each side long. */
function shrunk(box: Box, side: number): Box {
  return box.map(([low, high]) => {
    const cut = 0.5 * (1 - side) * (high - low);
    return [low + cut, high - cut] as const;
  });
}

/** Rate at which the mean displacement over the fluid in view is the wanted share of the spacing. */
function rateFor(one: LinkingCase, box: Box, flow: Flow, startTime: number): number {
  let rate = 1;
  for (let round = 0; round < RATE_ROUNDS; round++) {
    rate *= ratioAt(one, box, flow, rate, startTime) / one.ratio;
  }
  return rate;
}

/** Displacement ratio of a case at a rate, from the flow over the fluid in view. */
function ratioAt(one: LinkingCase, box: Box, flow: Flow, rate: number, startTime: number): number {
  const [x, y, z] = box;
  // A pair is looked at for one delay, but the pairs are spread over the flow's time.
  const frames = one.pairs ? (one.frames / 2) * PAIRS_APART : one.frames;
  const rest = { scale: 1, noisePx: 0, lossShare: 0, ghostShare: 0, seed: 1 };
  const region = z === undefined ? { x, y } : { x, y, z };
  return displacementRatio({ ...rest, flow, region, rate, frames, perFrame: one.perFrame, startTime });
}

/** Area or volume of the fluid in view, from a midpoint lattice where there is a solid (in the plane only). */
function room(box: Box, flow: Flow): number {
  const whole = box.reduce((product, [low, high]) => product * (high - low), 1);
  if (flow.inside === undefined) return whole;
  const points = 400;
  const at = (axis: number, n: number) => box[axis][0] + ((box[axis][1] - box[axis][0]) * (n + 0.5)) / points;
  let free = 0;
  for (let i = 0; i < points; i++) {
    for (let j = 0; j < points; j++) if (!flow.inside(at(0, i), at(1, j), 0)) free++;
  }
  return (whole * free) / (points * points);
}

type MotionColumns = Omit<TrueMotion, 'dims'> & Record<string, Float64Array | Uint32Array | Int32Array>;

function columnsOf({ time, offsets, x, y, z, particle }: TrueMotion): MotionColumns {
  return { time, offsets, x, y, z, particle };
}

/** Image pairs: each of a population of its own, since all fluid has passed between one pair and the next. */
function pairMotion(options: MotionOptions): MotionColumns {
  const pairs = options.frames / 2;
  const parts: TrueMotion[] = [];
  for (let pair = 0; pair < pairs; pair++) {
    const startTime = (options.startTime ?? 0) + (pair * PAIRS_APART) / options.rate;
    parts.push(trueMotion({ ...options, frames: 2, startTime, seed: seedFor(options.seed, `pair ${pair}`) | 0 }));
  }
  const joined = (column: 'x' | 'y' | 'z' | 'time') => {
    const into = new Float64Array(parts.reduce((sum, part) => sum + part[column].length, 0));
    let at = 0;
    for (const part of parts) {
      into.set(part[column], at);
      at += part[column].length;
    }
    return into;
  };
  const offsets = new Uint32Array(2 * pairs + 1);
  const x = joined('x');
  const particle = new Int32Array(x.length);
  let before = 0;
  for (const [pair, part] of parts.entries()) {
    offsets[2 * pair + 1] = before + part.offsets[1];
    offsets[2 * pair + 2] = before + part.offsets[2];
    // No two pairs share a particle: none has more than `options.perFrame` + those that came in.
    particle.set(
      part.particle.map((id) => 4 * options.perFrame * pair + id),
      before,
    );
    before += part.x.length;
  }
  return { time: joined('time'), offsets, x, y: joined('y'), z: joined('z'), particle };
}
