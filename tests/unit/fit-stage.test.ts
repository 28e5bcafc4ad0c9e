import type { LinkedBlock, SampleBlock } from '@wakeloom/tracker/core/columns';
import { createContext } from '@wakeloom/tracker/core/context';
import { fitParameters } from '@wakeloom/tracker/kinematics/fit-parameters';
import { fitStage } from '@wakeloom/tracker/kinematics/fit-stage';
import { fitWindow } from '@wakeloom/tracker/kinematics/fit-window';
import type { Prior, StageInput } from '@wakeloom/tracker/pipeline/stages';
import { resolveRun } from '@wakeloom/tracker/run/resolve';
import { describe, expect, it } from 'vitest';
import { sliceFrames } from '../helpers/linked.js';
import { madeTracks } from '../helpers/made-tracks.js';

const prior: Prior = {
  noise: [0.02, 0.02, Number.NaN],
  noiseMeasured: true,
  frameStep: 1,
  span: 5,
  reach: [1, 1, 1],
  spacing: 1,
  displacementRatio: 0.3,
  displacementRatio95: 0.5,
};

function stageInput(options: Parameters<typeof createContext>[0] = {}): StageInput {
  const { settings } = resolveRun({ options: { rate: '100 Hz' }, dumpFiles: ['made.csv'] });
  // The fit looks at settings, prior and context; the scan is for other stages.
  return { settings, prior, scan: undefined as unknown as StageInput['scan'], context: createContext(options) };
}

async function* oneByOne(block: LinkedBlock): AsyncGenerator<LinkedBlock> {
  for (let k = 0; k < block.number.length; k += 5) yield sliceFrames(block, k, Math.min(k + 5, block.number.length));
}

async function gather(samples: AsyncIterable<SampleBlock>): Promise<SampleBlock[]> {
  const all: SampleBlock[] = [];
  for await (const one of samples) all.push(one);
  return all;
}

// 1700 particles over 80 frames: more than two cores of 60 000 rows.
const block = madeTracks({
  seed: 'stage',
  frames: 80,
  particles: 1700,
  outliers: 0.005,
  timeOf: (frame) => (frame - 100) / 100,
});

describe('fit stage', () => {
  it('gives every linked detection once, in order, the same here and farmed out', async () => {
    const input = stageInput();
    const whole = fitWindow(block, { from: 0, to: block.number.length }, fitParameters(input.settings, prior));
    const progress: number[] = [];
    const here = await gather(
      fitStage({ ...input, context: createContext({ onProgress: (_, done) => progress.push(done) }) }, oneByOne(block)),
    );
    expect(here.length).toBeGreaterThan(1);
    expect(here.flatMap((one) => Array.from(one.number))).toEqual(Array.from(block.number));
    expect(here.flatMap((one) => Array.from(one.detection))).toEqual(Array.from(whole.detection));
    expect(here.flatMap((one) => Array.from(one.u))).toEqual(Array.from(whole.u));
    expect(progress.at(-1)).toBe(block.number.length);
    // A runner whose later windows are done first.
    let waiting = 0;
    let most = 0;
    let calls = 0;
    const late = await gather(
      fitStage(stageInput({ threads: 3, bytes: 2 ** 40 }), oneByOne(block), async (window, core, parameters) => {
        calls++;
        waiting++;
        most = Math.max(most, waiting);
        const turns = calls === 1 ? 20 : 0;
        for (let k = 0; k < turns; k++) await new Promise((resolve) => setImmediate(resolve));
        waiting--;
        return fitWindow(window, core, parameters);
      }),
    );
    expect(late.flatMap((one) => Array.from(one.flags))).toEqual(Array.from(whole.flags));
    expect(late.flatMap((one) => Array.from(one.uSe))).toEqual(Array.from(whole.uSe));
    expect(most).toBeGreaterThan(1);
    expect(most).toBeLessThanOrEqual(3);
  });

  it('an abort ends it with run/aborted, a failing runner with its own error', async () => {
    const controller = new AbortController();
    const aborted = gather(
      fitStage(stageInput({ signal: controller.signal }), oneByOne(block), async () => {
        controller.abort();
        throw new Error('worker gone');
      }),
    );
    await expect(aborted).rejects.toMatchObject({ message: expect.stringMatching(/worker gone|aborted/) });
    const stopped = new AbortController();
    stopped.abort();
    await expect(gather(fitStage(stageInput({ signal: stopped.signal }), oneByOne(block)))).rejects.toMatchObject({
      code: 'run/aborted',
    });
    const failing = gather(fitStage(stageInput(), oneByOne(block), () => Promise.reject(new Error('worker gone'))));
    await expect(failing).rejects.toThrow('worker gone');
  });

  it('nothing in, nothing out', async () => {
    async function* nothing(): AsyncGenerator<LinkedBlock> {}
    expect(await gather(fitStage(stageInput(), nothing()))).toEqual([]);
  });
});
