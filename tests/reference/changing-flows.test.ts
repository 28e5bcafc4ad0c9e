import type { Flow } from '@wakeloom/tracker/synthesis/flow';
import { describe, expect, it } from 'vitest';
import { linkBlock } from '../helpers/link-block';
import { scoreLinks } from '../helpers/score-links';
import { truthBlock, truthDump } from '../helpers/truth';

/**
 * Flows whose change from frame to frame is large against the spacing, each pair of frames easy by itself: a stream that
 * starts at once, and one that swings to and fro. Truth is exact: uniform velocities, integrated with 200 steps a frame.
 * Bars: those of the table of linking at a ratio of 1 for flows that are not carried past (0.98 and 0.90).
 */
const PER_FRAME = 1500;
const SIDE = 48;
const SPACING = SIDE / Math.sqrt(PER_FRAME);

/** Uniform velocity in x with time in frames. */
function swinging(velocity: (frame: number) => number): Flow {
  return {
    name: 'uniform, changing',
    dims: 2,
    velocity(_x, _y, _z, t, into) {
      into[0] = velocity(t);
      into[1] = 0;
    },
  };
}

const FLOWS: [string, Flow][] = [
  ['starts between two frames and moves by 1 spacing', swinging((t) => (t < 15.5 ? 0 : SPACING))],
  [
    'swings by 0.7 spacings a frame with a period of 12',
    swinging((t) => 0.7 * SPACING * Math.sin((2 * Math.PI * t) / 12)),
  ],
  [
    'swings by 1.5 spacings a frame with a period of 20',
    swinging((t) => 1.5 * SPACING * Math.sin((2 * Math.PI * t) / 20)),
  ],
];

describe('a stream that', () => {
  it.each(FLOWS)('%s is linked', async (_name, flow) => {
    const dump = truthDump({
      flow,
      frames: 30,
      rate: 1,
      perFrame: PER_FRAME,
      box: [
        [0, SIDE],
        [0, SIDE],
      ],
      lossShare: 0.05,
      ghostShare: 0.05,
      noise: 0.005,
      steps: 200,
      seed: 6,
    });
    const { pathline } = await linkBlock(truthBlock(dump), { rate: '1 Hz' });
    const score = scoreLinks(pathline, dump.particle, dump.frame, 2);
    expect(score.true).toBeGreaterThan(25_000);
    expect(score.precision).toBeGreaterThanOrEqual(0.98);
    expect(score.recall).toBeGreaterThanOrEqual(0.9);
  });
});
