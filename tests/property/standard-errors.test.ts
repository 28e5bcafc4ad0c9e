import { FLAG } from '@wakeloom/tracker/core/columns';
import type { FitParameters } from '@wakeloom/tracker/kinematics/fit-parameters';
import { fitWindow } from '@wakeloom/tracker/kinematics/fit-window';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { describe, expect, it } from 'vitest';
import { type LinkedPoint, linkedBlock } from '../helpers/linked.js';

/** Two-sided 95 % point of the normal distribution. */
const Z95 = 1.959964;

/**
 * Five standard deviations of a binomial share of 0.95 over n independent trials: a false alarm in two million runs.
 * The trials here are whole pathlines, one sample of each.
 */
const band = (n: number) => 5 * Math.sqrt((0.95 * 0.05) / n);

describe('standard errors cover the truth', () => {
  const pathlines = 4000;
  const frames = 13;
  const sigma = [0.05, 0.08, 0.2] as const;
  const truth = (t: number) => ({ x: 3 * t + 2 * t * t, u: 3 + 4 * t, ax: 4 });

  for (const [name, interval, order] of [
    ['even clock', 0.1, 2],
    ['uneven times', null, 2],
    ['even clock, cubic', 0.1, 3],
  ] as const) {
    it(`${name}: 95 % of positions, velocities, accelerations lie within 1.96 standard errors, per axis`, () => {
      const random = randomStream(51, name);
      const timeOf = (frame: number) => 0.1 * (frame + (interval === null ? 0.35 * Math.sin(1.7 * frame) : 0));
      const points: LinkedPoint[] = [];
      for (let frame = 0; frame < frames; frame++) {
        for (let p = 0; p < pathlines; p++) {
          // Gaps of one frame here and there.
          if ((frame * 7 + p * 5) % 11 === 0) continue;
          const { x } = truth(timeOf(frame));
          points.push({
            frame,
            pathline: p,
            x: x + sigma[0] * random.normal(),
            y: x + sigma[1] * random.normal(),
            z: x + sigma[2] * random.normal(),
          });
        }
      }
      const parameters: FitParameters = {
        noise: sigma,
        span: 7,
        order,
        bridge: 2,
        interval,
        pairs: false,
        riskLimit: 1,
        // Screening would cut the tails whose share is counted.
        medianThreshold: Number.POSITIVE_INFINITY,
        medianNeighbours: 8,
        medianEpsilon: null,
        offFitLimit: Number.POSITIVE_INFINITY,
        bodies: [],
        rim: 0,
      };
      const block = linkedBlock(points, { dims: 3, timeOf });
      const s = fitWindow(block, { from: 0, to: frames }, parameters);
      // First, middle and last frames: one-sided and centred fits, with and without gaps.
      for (const k of [0, 6, 12]) {
        const t = truth(timeOf(k));
        const from = s.offsets[k]!;
        const to = s.offsets[k + 1]!;
        const n = to - from;
        expect(n).toBeGreaterThan(3000);
        for (const [value, se, want] of [
          [s.x, s.xSe, t.x],
          [s.u, s.uSe, t.u],
          [s.ax, s.axSe, t.ax],
          [s.v, s.vSe, t.u],
          [s.z, s.zSe, t.x],
          [s.w, s.wSe, t.u],
          [s.az, s.azSe, t.ax],
        ] as const) {
          let inside = 0;
          for (let r = from; r < to; r++) if (Math.abs(value[r]! - want) <= Z95 * se[r]!) inside++;
          expect(Math.abs(inside / n - 0.95)).toBeLessThan(band(n));
        }
      }
    });
  }

  it('white noise alone is hardly ever screened: off-fit below 1e-4, off-neighbours below 1.5 %', () => {
    const random = randomStream(52, 'false alarms');
    const points: LinkedPoint[] = [];
    for (let frame = 0; frame < 20; frame++) {
      for (let p = 0; p < 1000; p++) {
        const x = (p % 40) + 0.4 * ((p * 37) % 11) + 0.1 * frame;
        const y = Math.floor(p / 40) + 0.09 * ((p * 53) % 10);
        points.push({ frame, pathline: p, x: x + 0.02 * random.normal(), y: y + 0.02 * random.normal() });
      }
    }
    const s = fitWindow(
      linkedBlock(points),
      { from: 0, to: 20 },
      {
        noise: [0.02, 0.02, Number.NaN],
        span: 7,
        order: 2,
        bridge: 2,
        interval: 1,
        pairs: false,
        riskLimit: 1,
        medianThreshold: 2,
        medianNeighbours: 8,
        medianEpsilon: null,
        offFitLimit: 5,
        bodies: [],
        rim: 0,
      },
    );
    const share = (bit: number) => s.flags.reduce((sum, f) => sum + ((f & bit) !== 0 ? 1 : 0), 0) / s.flags.length;
    expect(share(FLAG['off-fit'])).toBeLessThan(1e-4);
    expect(share(FLAG['off-neighbours'])).toBeLessThan(0.015);
  });
});
