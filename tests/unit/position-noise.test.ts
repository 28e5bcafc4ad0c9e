import { chooseSpan, forecastSpans } from '@wakeloom/tracker/kinematics/choose-span';
import { estimateNoise } from '@wakeloom/tracker/noise/position-noise';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { describe, expect, it } from 'vitest';
import { type LinkedPoint, linkedBlock, sliceFrames } from '../helpers/linked.js';

interface Motion {
  readonly frames: number;
  readonly particles: number;
  readonly noise: readonly [number, number, number];
  /** Position of particle p at time t. */
  readonly at: (p: number, t: number) => readonly [number, number, number];
  readonly timeOf?: (frame: number) => number;
  readonly keep?: (frame: number, p: number) => boolean;
  readonly outliers?: number;
  readonly segmentOf?: (frame: number) => number;
}

function observe(seed: string, motion: Motion, dims: 2 | 3 = 2) {
  const random = randomStream(41, seed);
  const points: LinkedPoint[] = [];
  const timeOf = motion.timeOf ?? ((frame: number) => frame);
  for (let frame = 0; frame < motion.frames; frame++) {
    for (let p = 0; p < motion.particles; p++) {
      const [x, y, z] = motion.at(p, timeOf(frame));
      const bad = random.uniform() < (motion.outliers ?? 0) ? 20 * motion.noise[0] : 0;
      const errors = motion.noise.map((sigma) => sigma * random.normal());
      if (motion.keep !== undefined && !motion.keep(frame, p)) continue;
      const pathline = motion.segmentOf === undefined ? p : 1000 * motion.segmentOf(frame) + p;
      points.push({ frame, pathline, x: x + errors[0]! + bad, y: y + errors[1]!, z: z + errors[2]! });
    }
  }
  return linkedBlock(points, { dims, timeOf, segmentOf: motion.segmentOf });
}

/** Constant acceleration: third differences see nothing of it. */
const thrown = (p: number, t: number) => [p + 0.3 * t + 0.01 * t * t, -0.2 * t, 0.005 * t * t] as const;

describe('position noise', () => {
  // Relative standard error of 1.4826 median over n independent values: 1.17 / sqrt(n) (the normal quartile's density);
  // overlapping differences are correlated, taken as n / 4: five of those.
  const band = (samples: number) => (5 * 1.17) / Math.sqrt(samples / 4);

  it('per axis, in a volume, constant acceleration dropped out', () => {
    const block = observe('volume', { frames: 60, particles: 60, noise: [0.1, 0.05, 0.3], at: thrown }, 3);
    const { sigma, samples, method } = estimateNoise([block]);
    expect(method).toBe('third-differences');
    expect(samples).toBe(57 * 60);
    for (const [axis, want] of [0.1, 0.05, 0.3].entries()) {
      expect(Math.abs(sigma[axis]! / want - 1)).toBeLessThan(band(samples));
    }
  });

  it('uneven times, gaps and 3 % displaced positions', () => {
    const block = observe('uneven', {
      frames: 80,
      particles: 80,
      noise: [0.1, 0.1, 0],
      at: (p, t) => [p + 8 * t + 90 * t * t, 0, 0],
      timeOf: (frame) => 0.02 * (frame + 0.4 * Math.sin(2.1 * frame)),
      keep: (frame, p) => (frame * 31 + p * 17) % 13 !== 0,
      outliers: 0.03,
    });
    const { sigma, samples } = estimateNoise([block]);
    // One displaced position spoils four differences: 12 % contamination widens the median by about 15 %.
    expect(sigma[0]! / 0.1).toBeGreaterThan(1 - band(samples));
    expect(sigma[0]! / 0.1).toBeLessThan(1.2 + band(samples));
    expect(Math.abs(sigma[1]! / 0.1 - 1)).toBeLessThan(band(samples));
    expect(sigma[2]).toBeNaN();
  });

  it('does not depend on how the frames are cut into blocks', () => {
    const block = observe('cut', { frames: 40, particles: 30, noise: [0.1, 0.1, 0], at: thrown });
    const pieces = [sliceFrames(block, 0, 7), sliceFrames(block, 7, 8), sliceFrames(block, 8, 40)];
    expect(estimateNoise(pieces)).toEqual(estimateNoise([block]));
  });

  it('image pairs: from the scatter of displacements among neighbours', () => {
    const random = randomStream(42, 'places');
    const place = Array.from({ length: 200 }, () => [30 * random.uniform(), 30 * random.uniform()] as const);
    const block = observe('pairs', {
      frames: 40,
      particles: 200,
      noise: [0.1, 0.1, 0],
      // A gentle shear: 0.01 a frame per length changes displacements by 0.02 from neighbour to neighbour.
      at: (p, t) => [place[p]![0] + (t % 2) * (1 + 0.01 * place[p]![1]), place[p]![1], 0],
      segmentOf: (frame) => Math.floor(frame / 2),
    });
    const { sigma, samples, method } = estimateNoise([block]);
    expect(method).toBe('neighbours');
    expect(samples).toBe(20 * 200);
    expect(Math.abs(sigma[0]! / 0.1 - 1)).toBeLessThan(0.1);
    expect(Math.abs(sigma[1]! / 0.1 - 1)).toBeLessThan(0.1);
  });

  it('says nothing where there is nothing', () => {
    const { sigma, samples } = estimateNoise([linkedBlock([{ frame: 0, pathline: 0, x: 1, y: 1 }])]);
    expect(sigma[0]).toBeNaN();
    expect(samples).toBe(0);
  });
});

describe('choice of the span', () => {
  const circle = (omega: number) => (p: number, t: number) =>
    [p + 10 * Math.cos(omega * t + p), 10 * Math.sin(omega * t + p), 0] as const;

  /** True mean square velocity error of the centred fit, by the closed attenuation of circular motion. */
  function trueError(m: number, omega: number, sigma: number): number {
    let top = 0;
    let bottom = 0;
    for (let k = -m; k <= m; k++) {
      top += k * Math.sin(k * omega);
      bottom += k * k;
    }
    const lost = 10 * omega * (1 - top / (omega * bottom));
    // Half of the square of the speed lost falls on either axis.
    return (lost * lost) / 2 + (sigma * sigma) / bottom;
  }

  for (const [omega, sigma] of [
    [0.05, 0.1],
    [0.1, 0.1],
    [0.2, 0.05],
    [0.3, 0.02],
  ] as const) {
    it(`circles at ${omega} a frame, noise ${sigma}: within 15 % of the least error that any span tried gives`, () => {
      const block = observe(`circle ${omega}`, {
        frames: 80,
        particles: 150,
        noise: [sigma, sigma, 0],
        at: circle(omega),
      });
      const span = chooseSpan([block], [sigma, sigma, Number.NaN], 2);
      const errors = Array.from({ length: 9 }, (_, k) => trueError(k + 2, omega, sigma));
      expect(trueError((span - 1) / 2, omega, sigma)).toBeLessThan(1.15 * Math.min(...errors));
    });
  }

  it('a uniform stream takes the longest span, a short record a short one', () => {
    const uniform = (p: number, t: number) => [p + t, 0, 0] as const;
    const long = observe('long', { frames: 80, particles: 60, noise: [0.1, 0.1, 0], at: uniform });
    const forecasts = forecastSpans([long], [0.1, 0.1, Number.NaN], 2);
    expect(forecasts.map((one) => one.span)).toEqual(Array.from({ length: 9 }, (_, k) => 2 * k + 5));
    // Noise part of span 7: sigma^2 / 28.
    expect(forecasts[1]!.noise).toBeCloseTo(0.01 / 28, 12);
    expect(chooseSpan([long], [0.1, 0.1, Number.NaN], 2)).toBeGreaterThanOrEqual(17);
    const short = observe('short', { frames: 8, particles: 200, noise: [0.1, 0.1, 0], at: uniform });
    expect(chooseSpan([short], [0.1, 0.1, Number.NaN], 2)).toBeLessThanOrEqual(7);
    expect(chooseSpan([], [0.1, 0.1, Number.NaN], 2)).toBe(5);
  });

  it('a few wrong links do not shorten the span much', () => {
    const block = observe('wrong', {
      frames: 80,
      particles: 60,
      noise: [0.1, 0.1, 0],
      at: circle(0.1),
      outliers: 0.005,
    });
    const clean = observe('wrong', { frames: 80, particles: 60, noise: [0.1, 0.1, 0], at: circle(0.1) });
    const noise = [0.1, 0.1, Number.NaN] as const;
    expect(Math.abs(chooseSpan([block], noise, 2) - chooseSpan([clean], noise, 2))).toBeLessThanOrEqual(2);
  });
});
