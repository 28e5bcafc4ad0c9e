import type { LinkedBlock, SampleBlock } from '@wakeloom/tracker/core/columns';
import { rowCount } from '@wakeloom/tracker/core/columns';
import { createContext } from '@wakeloom/tracker/core/context';
import { createFrameFit } from '@wakeloom/tracker/kinematics/create-frame-fit';
import { fitParameters } from '@wakeloom/tracker/kinematics/fit-parameters';
import { fitStage, type StartRemoteFit } from '@wakeloom/tracker/kinematics/fit-stage';
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

async function* oneByOne(block: LinkedBlock, frames = 5): AsyncGenerator<LinkedBlock> {
  const all = block.number.length;
  for (let k = 0; k < all; k += frames) yield sliceFrames(block, k, Math.min(k + frames, all));
}

/** The block several times, each time later: frames and pathlines of their own. */
async function* repeated(block: LinkedBlock, times: number): AsyncGenerator<LinkedBlock> {
  const frames = block.number[block.number.length - 1]! + 10;
  for (let n = 0; n < times; n++) {
    for await (const piece of oneByOne(block, 30)) {
      yield {
        ...piece,
        number: piece.number.map((number) => number + n * frames),
        time: piece.time.map((time) => time + (n * frames) / 100),
        pathline: piece.pathline.map((id) => (id < 0 ? id : id + 10_000 * n)),
      };
    }
  }
}

async function gather(samples: AsyncIterable<SampleBlock>): Promise<SampleBlock[]> {
  const all: SampleBlock[] = [];
  for await (const one of samples) all.push(one);
  return all;
}

// 1700 particles over 80 frames: several chunks of the fit.
const block = madeTracks({
  seed: 'stage',
  frames: 80,
  particles: 1700,
  outliers: 0.005,
  timeOf: (frame) => (frame - 100) / 100,
});

describe('fit stage', () => {
  it('gives every linked detection once, in order, the same here and in another thread', async () => {
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
    // Another thread whose first answers come late: what lies with it stays bounded, and the samples are the same.
    let waiting = 0;
    let most = 0;
    let calls = 0;
    const start: StartRemoteFit = (parameters) => {
      const fit = createFrameFit(parameters);
      let before: Promise<unknown> = Promise.resolve();
      const frames = (block: LinkedBlock) => {
        const rows = rowCount(block);
        waiting += rows;
        most = Math.max(most, waiting);
        const samples = [...fit.add(block)].filter((one) => one !== null);
        // The first answer waits until many more frames lie here, and the others wait for it.
        const first = ++calls === 1;
        const answer = before.then(async () => {
          do await new Promise((resolve) => setImmediate(resolve));
          while (first && waiting < 300_000);
          waiting -= rows;
          return samples;
        });
        before = answer;
        return answer;
      };
      const rest = fit.finish();
      // What is left comes a block at a time.
      const next = async () => {
        for (const samples of { [Symbol.iterator]: () => ({ next: () => rest.next() }) })
          if (samples !== null) return [samples];
        return [];
      };
      return { frames, rest: next, release: () => {} };
    };
    const late = await gather(fitStage(stageInput({ threads: 2 }), repeated(block, 6), start));
    const alone = await gather(fitStage(stageInput(), repeated(block, 6)));
    expect(late.flatMap((one) => Array.from(one.flags))).toEqual(alone.flatMap((one) => Array.from(one.flags)));
    expect(late.flatMap((one) => Array.from(one.uSe))).toEqual(alone.flatMap((one) => Array.from(one.uSe)));
    expect(most).toBeGreaterThanOrEqual(300_000);
    expect(most).toBeLessThan(500_000);
  });

  it('an abort ends it with run/aborted, a failing runner with its own error', async () => {
    const controller = new AbortController();
    const aborted = gather(
      fitStage(stageInput({ signal: controller.signal }), oneByOne(block), () => ({
        frames: async () => {
          controller.abort();
          throw new Error('worker gone');
        },
        rest: async () => [],
        release: () => {},
      })),
    );
    await expect(aborted).rejects.toMatchObject({ message: expect.stringMatching(/worker gone|aborted/) });
    const stopped = new AbortController();
    stopped.abort();
    await expect(gather(fitStage(stageInput({ signal: stopped.signal }), oneByOne(block)))).rejects.toMatchObject({
      code: 'run/aborted',
    });
    const failing = gather(
      fitStage(stageInput(), oneByOne(block), () => ({
        frames: () => Promise.reject(new Error('worker gone')),
        rest: async () => [],
        release: () => {},
      })),
    );
    await expect(failing).rejects.toThrow('worker gone');
  });

  it('nothing in, nothing out', async () => {
    async function* nothing(): AsyncGenerator<LinkedBlock> {}
    expect(await gather(fitStage(stageInput(), nothing()))).toEqual([]);
  });
});
