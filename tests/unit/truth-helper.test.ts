import { shearFlow, solidRotation } from '@wakeloom/tracker/synthesis/flows-elementary';
import { describe, expect, it } from 'vitest';
import { scoreLinks } from '../helpers/score-links.js';
import { carry } from '../helpers/true-motion.js';
import { truthDump } from '../helpers/truth.js';

describe('truth for tests', () => {
  it('carries a particle round a circle and back, with an error of the fifth order', () => {
    const miss = (steps: number) => {
      const [x, y] = carry(solidRotation(2), [1, 0], 0, 1.5, steps);
      return Math.hypot(x - Math.cos(3), y - Math.sin(3));
    };
    // Each of 60 steps turns by 0.05: below 60 * 0.05^6 / 6! in all; doubling the steps divides by 32.
    expect(miss(60)).toBeLessThan(1.3e-9);
    expect(miss(30) / miss(60)).toBeGreaterThan(25);
    expect(miss(30) / miss(60)).toBeLessThan(40);
    const there = carry(solidRotation(2), [1, 0], 0, 1.5, 60);
    const [backX, backY] = carry(solidRotation(2), there, 1.5, 0, 60);
    expect(Math.hypot(backX - 1, backY)).toBeLessThan(2.6e-9);
  });

  it('keeps the number in view while the stream runs through', () => {
    const dump = truthDump({
      flow: shearFlow(2, 20),
      frames: 40,
      rate: 20,
      perFrame: 400,
      box: [
        [0, 20],
        [0, 5],
      ],
      seed: 3,
      stayFrames: 50,
      steps: 2,
    });
    const late = dump.offsets[40] - dump.offsets[39];
    expect(Math.abs(late - 400)).toBeLessThan(100); // five standard deviations of a Poisson count of 400
    expect(new Set(dump.particle).size).toBeGreaterThan(800);
  });

  it('scores links by hand-made cases', () => {
    const frame = [0, 1, 2, 4, 0, 1, 2, 3];
    const particle = [7, 7, 7, 7, 8, 8, 8, -1];
    // All links of 7 with one missing frame bridged, all of 8: 3 + 2 true links.
    expect(scoreLinks(particle, particle, frame, 2)).toEqual({ precision: 1, recall: 1, made: 5, right: 5, true: 5 });
    // Without bridging the link over the gap is none.
    expect(scoreLinks(particle, particle, frame, 0)).toMatchObject({ true: 4, made: 5, right: 4 });
    // Tracks cross between frames 1 and 2: two wrong of five made, and the ghost caught: one more wrong.
    const crossed = [1, 1, 2, 2, 2, 2, 1, 1];
    expect(scoreLinks(crossed, particle, frame, 2)).toMatchObject({ made: 6, right: 3, true: 5 });
    // Made pathlines of two samples do not count, neither do particles seen only twice.
    expect(scoreLinks([1, 1, -1, -1, 2, 2, 2, -1], particle, frame, 2)).toMatchObject({ made: 2, right: 2, true: 5 });
    expect(scoreLinks([1, 1, 1], [1, 1, 2], [0, 1, 2], 2)).toMatchObject({ made: 2, right: 0, true: 0, recall: 1 });
  });
});
