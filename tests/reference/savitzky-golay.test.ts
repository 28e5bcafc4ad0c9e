import type { FitParameters } from '@wakeloom/tracker/kinematics/fit-parameters';
import { fitWindow } from '@wakeloom/tracker/kinematics/fit-window';
import { FitWeights, localWeights } from '@wakeloom/tracker/kinematics/local-fit';
import { describe, expect, it } from 'vitest';
import table from '../../data/reference/savitzky-golay-1964.json' with { type: 'json' };
import { linkedBlock } from '../helpers/linked.js';

/** Degree of the fit that each family stands for: the even and odd degree that share its weights. */
const DEGREES: Record<string, readonly number[]> = {
  'smoothing, quadratic/cubic': [2, 3],
  'first derivative, linear/quadratic': [1, 2],
  'first derivative, cubic/quartic': [3],
  'second derivative, quadratic/cubic': [2, 3],
};

function weightsOf(points: number, at: number, degree: number): FitWeights {
  const weights = new FitWeights(points);
  const offsets = Float64Array.from({ length: points }, (_, j) => j - at);
  localWeights(offsets, points, degree, 1, weights, new Float64Array(2 * points));
  return weights;
}

describe('Savitzky & Golay 1964, corrected by Steinier et al. 1972', () => {
  for (const family of Object.keys(DEGREES)) {
    it(`${family}: weights and noise gain of 5 to 25 points`, () => {
      const rows = table.tables.filter((row) => row.type === family);
      expect(rows.length).toBeGreaterThanOrEqual(10);
      for (const row of rows) {
        for (const degree of DEGREES[family]!) {
          if (row.points < degree + 1) continue;
          const weights = weightsOf(row.points, (row.points - 1) / 2, degree);
          const derivative = row.deriv;
          const mine = derivative === 0 ? weights.position : derivative === 1 ? weights.velocity : weights.acceleration;
          const root = [weights.positionRoot, weights.velocityRoot, weights.accelerationRoot][derivative]!;
          const largest = Math.max(...row.integers.map(Math.abs)) / row.norm;
          for (let j = 0; j < row.points; j++) {
            expect(Math.abs(mine[j]! - row.integers[j]! / row.norm)).toBeLessThan(1e-13 * largest);
          }
          // The table gives the gain to ten digits.
          expect(Math.abs((root * root) / row.noise_variance_gain - 1)).toBeLessThan(1e-9);
        }
      }
    });
  }

  it('first point of a 5-point quadratic', () => {
    const weights = weightsOf(5, 0, 2);
    const { smooth_first_point: smooth, first_derivative_first_point: slope } = table.edge_5pt_quadratic;
    for (let j = 0; j < 5; j++) {
      expect(weights.position[j]).toBeCloseTo(smooth[j]!, 14);
      expect(weights.velocity[j]).toBeCloseTo(slope[j]!, 14);
    }
  });
});

/** One particle on a unit circle, `theta` a frame, fitted over `span` frames; its middle sample. */
function onCircle(theta: number, span: number): { radius: number; speed: number } {
  const points = Array.from({ length: 41 }, (_, frame) => ({
    frame,
    pathline: 0,
    x: Math.cos(theta * frame),
    y: Math.sin(theta * frame),
  }));
  const parameters: FitParameters = {
    noise: [1, 1, Number.NaN],
    span,
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
  };
  const samples = fitWindow(linkedBlock(points), { from: 20, to: 21 }, parameters);
  return {
    radius: Math.hypot(samples.x[0]!, samples.y[0]!),
    speed: Math.hypot(samples.u[0]!, samples.v[0]!),
  };
}

describe('circular motion through the fit of a window', () => {
  it('5-point quadratic: radius and speed shrink as the exact response says', () => {
    const { samples_per_turn: turns, smooth, slope_ratio: slope } = table.circular_response;
    for (const [k, perTurn] of turns.entries()) {
      const theta = (2 * Math.PI) / perTurn;
      const { radius, speed } = onCircle(theta, 5);
      expect(radius).toBeCloseTo(smooth[k]!, 6);
      expect(speed / theta).toBeCloseTo(slope[k]!, 6);
    }
  });

  it('speed falls by sum(k sin(k theta)) / (theta sum(k^2)): 0.9541 at m = 3, theta = 0.2; 0.6716 at m = 6, theta = 0.3', () => {
    for (const [m, theta, stated] of [
      [3, 0.2, 0.9541],
      [6, 0.3, 0.6716],
    ] as const) {
      let top = 0;
      let bottom = 0;
      for (let k = -m; k <= m; k++) {
        top += k * Math.sin(k * theta);
        bottom += k * k;
      }
      const closed = top / (theta * bottom);
      expect(closed).toBeCloseTo(stated, 4);
      // Velocities of samples are single precision: 6e-8.
      expect(Math.abs(onCircle(theta, 2 * m + 1).speed / theta / closed - 1)).toBeLessThan(2e-7);
    }
  });
});
