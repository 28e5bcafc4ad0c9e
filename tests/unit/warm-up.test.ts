import type { DetectionBlock } from '@wakeloom/tracker';
import { createLinker, type LinkPrior } from '@wakeloom/tracker/linking/create-linker';
import { FlowGrid } from '@wakeloom/tracker/linking/flow-grid';
import type { LinkKnowledge } from '@wakeloom/tracker/linking/linker';
import { warmUp } from '@wakeloom/tracker/linking/warm-up';
import { resolveRun } from '@wakeloom/tracker/run/resolve';
import type { Flow } from '@wakeloom/tracker/synthesis/flow';
import { polynomialMotion, solidRotation } from '@wakeloom/tracker/synthesis/flows-elementary';
import { describe, expect, it } from 'vitest';
import { type TruthDump, truthBlock, truthDump } from '../helpers/truth';

const { linking } = resolveRun({ options: { rate: '1 Hz' }, dumpFiles: ['a.csv'] }).settings;
const SIZE = 24;
const NOISE = 0.01;
/** At the rim of the field particles move as far as they are apart. */
const RATE = 2 / SIZE;

/** One particle a unit of area, with losses and false detections of 5 % each. */
function dumpOf(flow: Flow, frames: number): TruthDump {
  const box: [number, number][] = [
    [0, SIZE],
    [0, SIZE],
  ];
  const perFrame = SIZE * SIZE;
  const seed = 5;
  return truthDump({
    flow,
    frames,
    rate: 1,
    perFrame,
    box,
    lossShare: 0.05,
    ghostShare: 0.05,
    noise: NOISE,
    steps: 8,
    seed,
  });
}

/** What a run would start from, with a picture of a flow as if each cell had seen nine links of it. */
function priorOf(velocity: (x: number, y: number) => [number, number]): LinkPrior {
  const picture = FlowGrid.empty(2, { min: [0, 0, 0], max: [SIZE, SIZE, 0] }, 6);
  const centre = new Float64Array(3);
  for (let cell = 0; cell < picture.cells; cell++) {
    picture.centre(cell, centre);
    for (let n = 0; n < 9; n++) {
      const [x, y] = [centre[0] + 1.5 * ((n % 3) - 1), centre[1] + 1.5 * (Math.floor(n / 3) - 1)];
      picture.learn(x, y, 0, ...velocity(x, y), 0);
    }
  }
  return {
    dims: 2,
    reach: 0.8,
    noiseSquare: 4 * NOISE * NOISE,
    expected: 0.02,
    density: 1,
    flow: picture.toData(),
    knowledge: null,
    pairs: false,
  };
}

const turning = dumpOf(solidRotation(RATE, SIZE / 2, SIZE / 2), 8);
/** Turns at half the speed. */
const wrong = priorOf((x, y) => [-0.5 * RATE * (y - SIZE / 2), 0.5 * RATE * (x - SIZE / 2)]);

const learn = (prior: LinkPrior, blocks: readonly DetectionBlock[], breathe = async () => {}) =>
  warmUp(createLinker(linking, prior), blocks, breathe);

function cut(dump: TruthDump, sizes: readonly number[], to = dump.number.length): DetectionBlock[] {
  const blocks: DetectionBlock[] = [];
  for (let from = 0, k = 0; from < to; k++) {
    const end = Math.min(to, from + sizes[k % sizes.length]);
    blocks.push(truthBlock(dump, from, end));
    from = end;
  }
  return blocks;
}

/** Links of the first interval: how many there are in truth, how many were made, how many of them are right. */
function firstInterval(dump: TruthDump, prior: LinkPrior, knowledge: LinkKnowledge | null) {
  const linker = createLinker(linking, { ...prior, knowledge });
  const block = truthBlock(dump, 0, 2);
  const pathline = new Int32Array(block.x.length);
  const risk = new Float32Array(block.x.length);
  for (const k of [0, 1]) linker.frame(block, k, pathline, risk);
  const [, second, end] = block.offsets;
  const particles = new Map<number, number>();
  for (let row = 0; row < second; row++) if (dump.particle[row] >= 0) particles.set(dump.particle[row], row);
  const score = { all: 0, made: 0, right: 0 };
  for (let row = second; row < end; row++) {
    const from = particles.get(dump.particle[row]);
    const linked = pathline.subarray(0, second).indexOf(pathline[row]);
    if (from !== undefined) score.all++;
    if (linked >= 0) score.made++;
    if (linked >= 0 && linked === from) score.right++;
  }
  return score;
}

describe('linking the first frames there and back', () => {
  it('makes the links of the first interval right although the first picture of the flow is wrong', async () => {
    const knowledge = await learn(wrong, [truthBlock(turning)]);
    const before = firstInterval(turning, wrong, null);
    const after = firstInterval(turning, wrong, knowledge);
    expect(after.all).toBeGreaterThan(400);
    // Without it: a link in ten missed, a link in ten wrong at the very least.
    expect(before.right).toBeLessThan(0.9 * before.all);
    expect(before.right).toBeLessThan(0.9 * before.made);
    // The bars that hold for the whole of a run at this ratio: 0.99 and 0.95.
    expect(after.right).toBeGreaterThanOrEqual(0.99 * after.made);
    expect(after.right).toBeGreaterThanOrEqual(0.95 * after.all);
  });

  it('ends with the flow of the first interval, running forward', async () => {
    // A stream that goes twice as fast after six frames: 0.35 of a spacing over the first interval, 0.75 over the fifth.
    const stream = dumpOf(polynomialMotion([0.3, 0.1], [0]), 6);
    const knowledge = await learn(
      priorOf(() => [0.3, 0]),
      [truthBlock(stream)],
    );
    const [x, , , u, v] = knowledge!.interval;
    expect(x.length).toBeGreaterThan(400);
    const mean = (column: Float64Array) => column.reduce((sum, value) => sum + value, 0) / column.length;
    // Noise of two detections a link, five standard deviations of the mean; a wrong link in a hundred errs by half.
    const error = (5 * NOISE * Math.SQRT2) / Math.sqrt(x.length) + 0.005;
    expect(Math.abs(mean(u) - 0.35)).toBeLessThan(error);
    expect(Math.abs(mean(v))).toBeLessThan(error);
    // The long picture runs forward too.
    const into = new Float64Array(3);
    new FlowGrid(knowledge!.flow).at(SIZE / 2, SIZE / 2, 0, into);
    expect(into[0]).toBeGreaterThan(0.3);
  });

  it('does not depend on how the frames are cut into blocks, nor on frames after the sixth', async () => {
    const whole = await learn(wrong, [truthBlock(turning)]);
    expect(whole!.interval[0].length).toBeGreaterThan(400);
    for (const sizes of [[1], [2, 1], [5, 3]]) expect(await learn(wrong, cut(turning, sizes))).toEqual(whole);
    expect(await learn(wrong, cut(turning, [4], 6))).toEqual(whole);
    expect(await learn(wrong, cut(turning, [4], 5))).not.toEqual(whole);
  });

  it('is nothing for fewer than three frames of the first segment', async () => {
    expect(await learn(wrong, [])).toBeNull();
    expect(await learn(wrong, cut(turning, [1], 1))).toBeNull();
    expect(await learn(wrong, cut(turning, [2], 2))).toBeNull();
    expect(await learn(wrong, cut(turning, [1], 2))).toBeNull();
    expect(await learn(wrong, cut(turning, [3], 3))).not.toBeNull();
    const bursts = (from: number) => ({
      ...truthBlock(turning),
      segment: Int32Array.from({ length: 8 }, (_, k) => (k < from ? 0 : 1)),
    });
    expect(await learn(wrong, [bursts(2)])).toBeNull();
    // Of a segment of four frames it is what four frames alone give.
    expect(await learn(wrong, [bursts(4)])).toEqual(await learn(wrong, cut(turning, [4], 4)));
  });

  it('leaves the blocks as they were, and pauses after every frame there and back', async () => {
    const block = truthBlock(turning);
    const before = structuredClone(block);
    let pauses = 0;
    await learn(wrong, [block], async () => {
      pauses++;
    });
    expect(block).toEqual(before);
    expect(pauses).toBe(12);
  });
});
