import { potentialCylinder } from '@wakeloom/tracker/synthesis/flows-bodies';
import { taylorGreen } from '@wakeloom/tracker/synthesis/flows-cellular';
import { shearFlow, solidRotation, uniformFlow } from '@wakeloom/tracker/synthesis/flows-elementary';
import { burgersVortex } from '@wakeloom/tracker/synthesis/flows-vortices';
import { describe, expect, it } from 'vitest';
import { joinedBefore, scoreLinks } from '../helpers/score-links.js';
import { carry, enoughSteps, trueMotion } from '../helpers/true-motion.js';
import { detect, truthBlock, truthDump } from '../helpers/truth.js';

describe('true motion', () => {
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

  it.each([
    ['through all sides in the plane', taylorGreen(3, 0.4), [3, 11], [2, 12], undefined],
    ['round a body', potentialCylinder(4, 2), [-5, 9], [-6, 5], undefined],
    ['through all sides of a volume', burgersVortex(60, 1, 1, 4), [-3, 5], [-4, 4], [-3, 3]],
  ] as const)('stays evenly dense %s', (_name, flow, x, y, z) => {
    const box = z === undefined ? [x, y] : [x, y, z];
    const motion = trueMotion({ flow, frames: 30, rate: 10, perFrame: 2000, box, seed: 8, steps: 4 });
    const start = motion.offsets[29];
    const late = motion.offsets[30] - start;
    expect(Math.abs(late - 2000)).toBeLessThan(5 * Math.sqrt(2000));
    // Of the particles of the last frame those in each half of each axis, against the fluid there.
    const probe = trueMotion({ flow, frames: 1, rate: 10, perFrame: 200_000, box, seed: 9 });
    for (const [axis, [low, high]] of box.entries()) {
      const column = (of: typeof motion) => [of.x, of.y, of.z][axis];
      const share = probe.x.reduce((n, _x, i) => n + Number(column(probe)[i] < 0.5 * (low + high)), 0) / 200_000;
      let lower = 0;
      for (let row = start; row < start + late; row++) if (column(motion)[row] < 0.5 * (low + high)) lower++;
      expect(Math.abs(lower - share * late)).toBeLessThan(5 * Math.sqrt(share * (1 - share) * late));
    }
  });

  it('finds how many steps are enough, and refuses a place that is no number', () => {
    const turn = solidRotation(2);
    const box = [
      [-1, 1],
      [-1, 1],
    ] as const;
    const steps = enoughSteps({ flow: turn, frames: 10, rate: 1, perFrame: 1, box, seed: 2 }, 1, 1e-7);
    const [x, y] = carry(turn, [1, 0], 0, 1, steps);
    expect(Math.hypot(x - Math.cos(2), y - Math.sin(2))).toBeLessThan(1e-7);
    expect(steps).toBeLessThan(64);
    const broken = uniformFlow(Number.NaN, 0);
    expect(() => trueMotion({ flow: broken, frames: 2, rate: 1, perFrame: 1, box, seed: 2 })).toThrow('finite');
  });
});

describe('detections of a true motion', () => {
  const box = [
    [0, 100],
    [0, 100],
  ] as const;
  const motion = trueMotion({ flow: uniformFlow(0, 0), frames: 20, rate: 1, perFrame: 2000, box, seed: 4, steps: 1 });

  it('loses, adds and shifts as asked', () => {
    const dump = detect(motion, { lossShare: 0.1, ghostShare: 0.2, noise: [0.1, 0.3], perFrame: 2000, box, seed: 6 });
    const ghosts = dump.particle.filter((id) => id < 0).length;
    expect(ghosts).toBe(20 * 400);
    const seen = dump.x.length - ghosts;
    // 40 000 trials; five standard deviations.
    expect(Math.abs(seen - 36_000)).toBeLessThan(5 * Math.sqrt(40_000 * 0.1 * 0.9));
    const spread = (column: 'x' | 'y') => {
      let sum = 0;
      for (let row = 0; row < dump.x.length; row++) {
        const from = dump.source[row];
        if (from < 0) continue;
        expect(motion.particle[from]).toBe(dump.particle[row]);
        sum += (dump[column][row] - motion[column][from]) ** 2;
      }
      return Math.sqrt(sum / seen);
    };
    // The relative error of a standard deviation from n values is 1 / sqrt(2 n) = 0.0037.
    expect(Math.abs(spread('x') / 0.1 - 1)).toBeLessThan(0.02);
    expect(Math.abs(spread('y') / 0.3 - 1)).toBeLessThan(0.02);
  });

  it('puts the rows of a frame in an order that tells nothing, the same for the same seed', () => {
    const options = { ghostShare: 0.5, perFrame: 2000, box, seed: 6 };
    const dump = detect(motion, options);
    const first = dump.particle.subarray(0, dump.offsets[1]);
    const ghostsAhead = first.subarray(0, 1500).filter((id) => id < 0).length;
    // Half of 1000 ghosts among 3000 rows: hypergeometric, variance 500 * (2/3) * (1/2).
    expect(Math.abs(ghostsAhead - 500)).toBeLessThan(5 * Math.sqrt(167));
    expect(truthBlock(detect(motion, options))).toEqual(truthBlock(dump));
    expect(truthBlock(dump, 3, 5).x).toEqual(dump.x.subarray(dump.offsets[3], dump.offsets[5]));
  });
});

describe('scores of links', () => {
  const frame = [0, 1, 2, 4, 0, 1, 2, 3];
  const particle = [7, 7, 7, 7, 8, 8, 8, -1];

  it('agree with hand-made cases', () => {
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

  it('break a particle where it was away for longer than the bridge: each part needs three', () => {
    // Seen in frames 0, 1, 2, then 6, 7: the gap of four frames is no link, and the second part has two.
    const id = [5, 5, 5, 5, 5];
    const at = [0, 1, 2, 6, 7];
    expect(scoreLinks(id, id, at, 2)).toMatchObject({ true: 2, made: 4, right: 2 });
    expect(scoreLinks(id, id, at, 3)).toMatchObject({ true: 4, made: 4, right: 4 });
    // Exactly bridge + 1 frames apart is a link.
    expect(scoreLinks([1, 1, 1], [1, 1, 1], [0, 3, 6], 2)).toMatchObject({ true: 2, right: 2 });
    expect(scoreLinks([1, 1, 1], [1, 1, 1], [0, 3, 7], 2)).toMatchObject({ true: 0, right: 0 });
  });

  it('count a link that skips a detection of its particle as wrong, and the two skipped as missed', () => {
    expect(scoreLinks([1, -1, 1, 1], [4, 4, 4, 4], [0, 1, 2, 3], 2)).toMatchObject({ true: 3, made: 2, right: 1 });
  });

  it('do not depend on the order of rows', () => {
    const back = <T>(column: readonly T[]) => [...column].reverse();
    const made = [1, 1, 2, 2, 2, 2, 1, 1];
    expect(scoreLinks(back(made), back(particle), back(frame), 2)).toEqual(scoreLinks(made, particle, frame, 2));
  });

  it('take two detections for image pairs', () => {
    expect(scoreLinks([1, 2, 1, 2], [3, 4, 3, -1], [0, 0, 1, 1], 0, 2)).toMatchObject({ true: 1, made: 2, right: 1 });
    expect(scoreLinks([1, 2, 1, 2], [3, 4, 3, -1], [0, 0, 1, 1], 0)).toMatchObject({ true: 0, made: 0 });
  });

  it('name the row before each, -1 where no link counts', () => {
    expect([...joinedBefore(particle, frame, 3, 3)]).toEqual([-1, 0, 1, 2, -1, 4, 5, -1]);
    expect([...joinedBefore(particle, frame, 3, 1)]).toEqual([-1, 0, 1, -1, -1, 4, 5, -1]);
    expect([...joinedBefore(particle, frame, 4)]).toEqual([-1, 0, 1, 2, -1, -1, -1, -1]);
  });
});
