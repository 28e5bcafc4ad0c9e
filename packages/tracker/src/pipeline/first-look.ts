import type { DetectionBlock, Dims, LinkedBlock } from '../core/columns.js';
import type { RunContext } from '../core/context.js';
import { WakeloomError } from '../core/errors.js';
import { formatNumber, formatQuantity } from '../figures/number-format.js';
import { bestSpan, forecastSpans } from '../kinematics/choose-span.js';
import { createLinker, type LinkPrior } from '../linking/create-linker.js';
import type { Box } from '../linking/flow-grid.js';
import { chooseReach } from '../linking/reach.js';
import { StuckLinks, withoutPlaces } from '../linking/stuck-links.js';
import { findStuckPlaces, type StuckPlace, withinFlow } from '../linking/stuck-places.js';
import { type FramePair, voteFlow } from '../linking/vote-flow.js';
import { warmUp } from '../linking/warm-up.js';
import { estimateNoise } from '../noise/position-noise.js';
import type { RunSettings } from '../run/settings.js';
import { linkDisplacements } from './displacements.js';
import { linkBlock } from './link-block.js';
import { spacingOfNeighbours } from './spacing.js';
import type { Prior } from './stages.js';

/** Pairs of frames that vote for the flow: few, because the flow may change meanwhile. */
const VOTING_PAIRS = 6;
/** Pairs of an image-pair recording: many, because none has a neighbour in time. */
const VOTING_IMAGE_PAIRS = 40;
/** Detections that vote at most, and detections that are linked on trial for noise and span at most. */
const VOTING_ROWS = 120_000;
const TRIAL_ROWS = 400_000;
/** Detections that tell the noise at most: a robust estimate from so many is good to a few parts in a thousand. */
const NOISE_ROWS = 120_000;
/** Detections that choose the span at most: the mean square over so many is good to a few per cent. */
const SPAN_ROWS = 60_000;
/** Position noise to assume where it cannot be measured, in mean spacings (about 0.1 px at usual seeding; common practice, no source). */
const ASSUMED_NOISE = 0.004;
/** Least position noise that gates are built on, in mean spacings. */
const LEAST_NOISE = 0.001;
/** Span where none can be chosen from the data (7 frames; velocity 5 to 9 points is common practice, no source). */
const DEFAULT_SPAN = 7;

/** What the first look gives: figures for the record, and what the linker starts from. */
export interface FirstLook {
  readonly prior: Prior;
  readonly link: LinkPrior;
  /** Places that hold a detection in most frames: what stands there takes no part in the linking of the flow. */
  readonly stuck: readonly StuckPlace[];
  /**
   * Root mean square by which the local fit over the span is forecast to err for its stiffness, one velocity component,
   * length per time; null where the first pathlines do not tell it (image pairs; too few, or too short for the span).
   */
  readonly smoothing: number | null;
}

/** Frames that the first look wants to see at most, and rows. Whoever feeds it may stop there. */
export const FIRST_LOOK = { frames: 240, rows: TRIAL_ROWS } as const;

/**
 * First look at the data: density and spacing, the flow by votes, the reach, then a trial linking of the first
 * frames that gives position noise, span and displacement ratio. Bounded work whatever the length of the run.
 * `blocks`: the first calibrated frames, counted in steps of `frameStep`; borrowed.
 *
 * Throws `linking/no-detections` where there is nothing to look at.
 */
export async function firstLook(
  blocks: readonly DetectionBlock[],
  settings: RunSettings,
  frameStep: number,
  context: RunContext,
): Promise<FirstLook> {
  const dims: Dims = blocks[0]?.dims ?? 2;
  const depthNoise = dims === 3 ? settings.linking.depthNoise : 1;
  const { box, perFrame } = extent(blocks);
  if (!(perFrame > 0)) {
    throw new WakeloomError(
      'linking/no-detections',
      'linking: got no detection in the first frames, expected some (after the region of interest and bodies were applied); check geometry, region and body',
    );
  }
  const local = spacingOfNeighbours(blocks, dims);
  const spacing = local > 0 ? local : meanSpacing(box, dims, perFrame);
  const linkSpacing = dims === 3 ? spacing / Math.cbrt(depthNoise) : spacing;
  const pairsClock = settings.clock.kind === 'pairs';
  // What stands still would vote for fluid at rest, and answer a prediction now and then.
  const suspects = pairsClock
    ? []
    : await findStuckPlaces(blocks, dims, spacing, depthNoise, async () => context.breathe());
  const moving = withoutStuck(blocks, suspects, settings.linking.bridge);
  const pairs = framePairs(moving, pairsClock ? VOTING_IMAGE_PAIRS : VOTING_PAIRS);
  const options = { dims, box, spacing: linkSpacing, depthNoise };
  const flow = await voteFlow(pairs, options, context);
  const voted = chooseReach(pairs, flow, options);
  const reach = settings.linking.reach === 'auto' ? voted.reach : settings.linking.reach;
  const density = 1 / linkSpacing ** dims;
  const start = (noise: number): LinkPrior => ({
    dims,
    reach,
    noiseSquare: 2 * dims * noise * noise,
    expected: voted.expected,
    density,
    flow: flow.toData(),
    knowledge: null,
    pairs: pairsClock,
  });
  const at = new Float64Array(3);
  const stuck = withinFlow(suspects, (x, y, z) => {
    flow.at(x, y, z, at);
    return Math.sqrt(at[0] * at[0] + at[1] * at[1] + (dims === 3 ? at[2] * at[2] : 0));
  });
  if (stuck.length > 0) {
    context.event({
      code: 'linking/stuck-places',
      level: 'warning',
      message: `${stuck.length} places hold a detection in most frames although the flow passes them (dirt, reflections, particles on a wall): what stands there is linked apart and flagged "stuck"`,
      details: { places: stuck.length, x: stuck[0].at[0], y: stuck[0].at[1] },
    });
  }
  const free = stuck.length === suspects.length ? moving : withoutStuck(blocks, stuck, settings.linking.bridge);
  // Pairs know the flow from all of them already.
  const informed = async (prior: LinkPrior): Promise<LinkPrior> => {
    if (pairsClock) return prior;
    const linker = createLinker(settings.linking, prior);
    return { ...prior, knowledge: await warmUp(linker, free, async () => context.breathe()) };
  };
  const trial = await trialLinking(free, settings, await informed(start(ASSUMED_NOISE * spacing)), context);
  await context.breathe();
  const measured = estimateNoise(leading(trial, NOISE_ROWS));
  await context.breathe();
  const noise: [number, number, number] = [0, 0, 0];
  for (let axis = 0; axis < dims; axis++) {
    const sigma = measured.sigma[axis];
    noise[axis] = sigma > 0 ? sigma : ASSUMED_NOISE * spacing;
  }
  // One figure for both axes of the plane: gates must not depend on how the camera was turned.
  const inPlane = Math.sqrt(0.5 * (noise[0] * noise[0] + noise[1] * noise[1]));
  const { span: wanted, order } = settings.smoothing;
  const forecasts = pairsClock ? [] : forecastSpans(leading(trial, SPAN_ROWS), noise, order);
  const span = wanted !== 'auto' ? wanted : pairsClock ? DEFAULT_SPAN : bestSpan(forecasts);
  const forecast = forecasts.find((one) => one.span === span);
  await context.breathe();
  const moved = linkDisplacements(trial, spacing);
  context.event({
    code: 'linking/first-look',
    level: 'info',
    message: `reach ${formatQuantity(reach, settings.units.length)}, span ${span} frames, position noise ${formatQuantity(inPlane, settings.units.length, 3)}, displacement ratio ${formatNumber(moved.mean, 3)}`,
    details: { reach, span, noise, ratio: moved.mean, ratio95: moved.p95, pairs: pairs.length },
  });
  return {
    prior: {
      noise,
      frameStep,
      span,
      reach: [reach, reach, reach * depthNoise],
      spacing,
      noiseMeasured: measured.sigma[0] > 0,
      displacementRatio: Number.isNaN(moved.mean) ? null : moved.mean,
      displacementRatio95: Number.isNaN(moved.p95) ? null : moved.p95,
    },
    // No real detection is better than a thousandth of a spacing; a gate of rounding errors would lose links.
    link: await informed(start(Math.max(inPlane, LEAST_NOISE * spacing))),
    stuck,
    smoothing: forecast === undefined ? null : Math.sqrt(forecast.bias) / meanInterval(trial),
  };
}

/** Mean time from frame number to frame number within segments; NaN where no two frames follow one another. */
function meanInterval(blocks: readonly LinkedBlock[]): number {
  let time = 0;
  let steps = 0;
  for (const { number, segment, time: times } of blocks) {
    for (let k = 1; k < number.length; k++) {
      if (segment[k] !== segment[k - 1]) continue;
      time += times[k] - times[k - 1];
      steps += number[k] - number[k - 1];
    }
  }
  return time / steps;
}

/** The blocks without what stands at the places; themselves where there are none. */
function withoutStuck(
  blocks: readonly DetectionBlock[],
  places: readonly StuckPlace[],
  bridge: number,
): readonly DetectionBlock[] {
  if (places.length === 0) return blocks;
  const links = new StuckLinks(places, blocks[0].dims, bridge);
  return blocks.map((block) => withoutPlaces(block, links.take(block)).block);
}

/** Share of detections at either end of each axis that do not count for the box: strays of the detection software. */
const STRAY_SHARE = 0.001;
/** Box that holds all but a few in a thousand of the detections, and their mean number a frame. */
function extent(blocks: readonly DetectionBlock[]): { box: Box; perFrame: number } {
  const min: [number, number, number] = [0, 0, 0];
  const max: [number, number, number] = [0, 0, 0];
  let rows = 0;
  let frames = 0;
  for (const block of blocks) {
    rows += block.x.length;
    frames += block.number.length;
  }
  for (const [axis, name] of (['x', 'y', 'z'] as const).entries()) {
    // All of them: a selection by row would not be the same for a mirrored field.
    const sorted = new Float64Array(blocks.reduce((sum, block) => sum + block[name].length, 0));
    let at = 0;
    for (const block of blocks) {
      sorted.set(block[name], at);
      at += block[name].length;
    }
    if (sorted.length === 0) continue;
    sorted.sort();
    // From few detections the very ends are taken: a thousandth of them is none.
    const cut = Math.floor(STRAY_SHARE * sorted.length);
    min[axis] = sorted[cut];
    max[axis] = sorted[sorted.length - 1 - cut];
  }
  return { box: { min, max }, perFrame: frames > 0 ? rows / frames : 0 };
}

/** n^(-1/D) from the box, for frames of a few particles; along an axis without extent the others decide. */
function meanSpacing(box: Box, dims: Dims, perFrame: number): number {
  let size = 1;
  let axes = 0;
  for (let axis = 0; axis < dims; axis++) {
    const length = box.max[axis] - box.min[axis];
    if (length > 0) {
      size *= length;
      axes++;
    }
  }
  if (axes === 0) return 1;
  const cell = size / perFrame;
  return axes === 1 ? cell : axes === 2 ? Math.sqrt(cell) : Math.cbrt(cell);
}

/** The first pairs of successive frames within a segment, up to a number of pairs and rows. */
function framePairs(blocks: readonly DetectionBlock[], most: number): FramePair[] {
  const pairs: FramePair[] = [];
  let rows = 0;
  for (const block of blocks) {
    for (let k = 0; k + 1 < block.number.length; k++) {
      if (block.segment[k] !== block.segment[k + 1] || block.number[k + 1] - block.number[k] !== 1) continue;
      const more = block.offsets[k + 2] - block.offsets[k];
      if (pairs.length >= most || (pairs.length > 0 && rows + more > VOTING_ROWS)) return pairs;
      rows += more;
      pairs.push({ block, first: k, second: k + 1 });
    }
  }
  return pairs;
}

async function trialLinking(
  blocks: readonly DetectionBlock[],
  settings: RunSettings,
  prior: LinkPrior,
  context: RunContext,
): Promise<LinkedBlock[]> {
  const linker = createLinker(settings.linking, prior);
  const linked: LinkedBlock[] = [];
  for (const block of blocks) linked.push(await linkBlock(linker, block, context));
  return linked;
}

/** The first blocks, as many as hold `rows` rows (at least one). */
function leading(blocks: readonly LinkedBlock[], rows: number): LinkedBlock[] {
  const taken: LinkedBlock[] = [];
  let sum = 0;
  for (const block of blocks) {
    if (taken.length > 0 && sum + block.x.length > rows) break;
    taken.push(block);
    sum += block.x.length;
  }
  return taken;
}
