import type { LinkedBlock, SampleBlock } from '@wakeloom/tracker/core/columns';
import { FLAG } from '@wakeloom/tracker/core/columns';
import { createFrameFit } from '@wakeloom/tracker/kinematics/create-frame-fit';
import { type FitParameters, fitLag } from '@wakeloom/tracker/kinematics/fit-parameters';
import { fitWindow } from '@wakeloom/tracker/kinematics/fit-window';
import { describe, expect, it } from 'vitest';
import { sliceFrames } from '../helpers/linked.js';
import { madeTracks } from '../helpers/made-tracks.js';

function parameters(change: Partial<FitParameters> = {}): FitParameters {
  return {
    noise: [0.02, 0.02, 0.04],
    span: 5,
    order: 2,
    bridge: 2,
    interval: 0.01,
    pairs: false,
    riskLimit: 0.5,
    medianThreshold: 2,
    medianNeighbours: 8,
    medianEpsilon: null,
    offFitLimit: 5,
    bodies: [{ kind: 'circle', centre: [30, 30], diameter: 6 }],
    rim: 0.5,
    ...change,
  };
}

const COLUMNS = [
  'pathline x y z u v w ax ay az xSe ySe zSe uSe vSe wSe axSe aySe azSe',
  'measuredX measuredY measuredZ linkRisk detection flags',
]
  .join(' ')
  .split(' ') as (keyof SampleBlock)[];

/** All bytes of the samples, column after column, blocks joined. */
function bytesOf(blocks: readonly SampleBlock[]): string[] {
  return COLUMNS.map((name) => {
    const parts = blocks.map((block) => block[name] as Float64Array);
    return parts.map((part) => Buffer.from(part.buffer, part.byteOffset, part.byteLength).toString('hex')).join('');
  });
}

async function* stream(block: LinkedBlock, sizes: readonly number[]): AsyncGenerator<LinkedBlock> {
  let from = 0;
  for (let k = 0; from < block.number.length; k++) {
    const to = Math.min(block.number.length, from + sizes[k % sizes.length]!);
    yield sliceFrames(block, from, to);
    from = to;
  }
}

async function fitInCuts(
  block: LinkedBlock,
  sizes: readonly number[],
  p: FitParameters,
): Promise<{ samples: SampleBlock[]; early: number }> {
  const fit = createFrameFit(p);
  const samples: SampleBlock[] = [];
  const keep = (steps: Iterable<SampleBlock | null>) => {
    for (const one of steps) if (one !== null) samples.push(one);
  };
  for await (const piece of stream(block, sizes)) keep(fit.add(piece));
  const early = samples.length;
  keep(fit.finish());
  return { samples, early };
}

describe('samples do not depend on where the run is cut', () => {
  const uneven = (frame: number) => 0.01 * (frame + 0.3 * Math.sin(frame));
  const cases: [string, LinkedBlock, FitParameters][] = [
    ['even clock', madeTracks({ seed: 'a', frames: 130, particles: 150, outliers: 0.02 }), parameters()],
    [
      'uneven times, cubic',
      madeTracks({ seed: 'b', frames: 110, particles: 80, outliers: 0.02, timeOf: uneven }),
      parameters({ interval: null, order: 3, span: 7 }),
    ],
    ['volume', madeTracks({ seed: 'c', frames: 90, particles: 120, dims: 3, outliers: 0.02 }), parameters()],
    ['span 3', madeTracks({ seed: 'd', frames: 60, particles: 60, outliers: 0.05 }), parameters({ span: 3, order: 1 })],
  ];
  for (const [name, block, p] of cases) {
    it(name, async () => {
      const whole = fitWindow(block, { from: 0, to: block.number.length }, p);
      const want = bytesOf([whole]);
      // Screening must have had something to do, or the test would prove little.
      const flagged = (bit: number) => whole.flags.reduce((sum, flags) => sum + ((flags & bit) !== 0 ? 1 : 0), 0);
      expect(flagged(FLAG['off-fit'])).toBeGreaterThan(5);
      expect(flagged(FLAG['off-neighbours'])).toBeGreaterThan(5);
      expect(flagged(FLAG.bridged)).toBeGreaterThan(20);
      for (const sizes of [[1], [3, 7, 1], [50]]) {
        const { samples, early } = await fitInCuts(block, sizes, p);
        expect(samples.flatMap((one) => Array.from(one.number))).toEqual(Array.from(block.number));
        expect(bytesOf(samples)).toEqual(want);
        // It was not all done at the end.
        expect(early).toBeGreaterThan(1);
      }
    });
  }

  it('not even where a core is one frame long', () => {
    const p = parameters();
    const lag = fitLag(p);
    const block = madeTracks({ seed: 'e', frames: 60, particles: 100, outliers: 0.03 });
    const frames = block.number.length;
    const whole = fitWindow(block, { from: 0, to: frames }, p);
    const pieces: SampleBlock[] = [];
    for (let k = 0; k < frames; k++) {
      const from = Math.max(0, k - lag);
      const window = sliceFrames(block, from, Math.min(frames, k + 1 + lag));
      pieces.push(fitWindow(window, { from: k - from, to: k - from + 1 }, p));
    }
    expect(bytesOf(pieces)).toEqual(bytesOf([whole]));
  });
});

describe('samples follow the data', () => {
  const block = madeTracks({ seed: 'f', frames: 40, particles: 120, outliers: 0.02 });
  const all = { from: 0, to: block.number.length };
  const plain = fitWindow(block, all, parameters({ bodies: [] }));

  it('scaled by powers of two: the same bits, scaled', () => {
    const scaled = { ...block, x: block.x.map((x) => 8 * x), y: block.y.map((y) => 8 * y) };
    const big = fitWindow(scaled, all, parameters({ bodies: [], noise: [0.16, 0.16, 0.32] }));
    expect(big.flags).toEqual(plain.flags);
    expect(big.x).toEqual(plain.x.map((x) => 8 * x));
    expect(big.u).toEqual(plain.u.map((u) => 8 * u));
    expect(big.axSe).toEqual(plain.axSe.map((se) => 8 * se));
  });

  it('x and y exchanged: the same samples, exchanged', () => {
    const turned = fitWindow({ ...block, x: block.y, y: block.x }, all, parameters({ bodies: [] }));
    expect(turned.x).toEqual(plain.y);
    expect(turned.v).toEqual(plain.u);
    expect(turned.ay).toEqual(plain.ax);
    const differ = turned.flags.reduce((sum, flags, s) => sum + (flags === plain.flags[s] ? 0 : 1), 0);
    // The plane through neighbours is solved in another order of unknowns: only its last bits may differ.
    expect(differ).toBe(0);
  });
});
