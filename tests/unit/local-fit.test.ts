import { FitWeights, fitPoint, localWeights } from '@wakeloom/tracker/kinematics/local-fit';
import { WeightTable } from '@wakeloom/tracker/kinematics/weight-table';
import { LeastSquares } from '@wakeloom/tracker/math/least-squares';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { describe, expect, it } from 'vitest';

/** Value, first and second derivative of c0 + c1 t + c2 t^2 + c3 t^3. */
function cubic(c: readonly number[], t: number): readonly [number, number, number] {
  const [a = 0, b = 0, d = 0, e = 0] = c;
  return [a + t * (b + t * (d + t * e)), b + t * (2 * d + 3 * t * e), 2 * d + 6 * t * e];
}

function close(actual: number, expected: number, scale: number, tolerance: number): void {
  expect(Math.abs(actual - expected)).toBeLessThanOrEqual(tolerance * scale);
}

describe('local polynomial fit', () => {
  it('gives polynomial motions back to 1e-9, on uneven times with gaps, inside and at the ends', () => {
    const random = randomStream(3, 'polynomials');
    for (const order of [1, 2, 3]) {
      for (let trial = 0; trial < 50; trial++) {
        const coefficients = Array.from({ length: order + 1 }, () => random.normal());
        // Times in s at about 60 Hz, far from zero, with jitter and dropped frames.
        const times: number[] = [];
        for (let f = 0; f < 11; f++) if (f % 4 !== 2) times.push(5 + (f + 0.3 * random.uniform()) / 60);
        const middle = times[Math.floor(times.length / 2)]!;
        const values = times.map((t) => 100 + cubic(coefficients, (t - middle) * 60)[0]);
        for (const at of [times[0]!, times[3]!, times.at(-1)!]) {
          const fit = fitPoint(Float64Array.from(times), Float64Array.from(values), at, order);
          const [x, v, a] = cubic(coefficients, (at - middle) * 60);
          close(fit.position, 100 + x, 100, 1e-12);
          // Velocities of order 1 a frame = 60 a s; the positions near 100 are rounded to 1.4e-14.
          close(fit.velocity, v * 60, 60, 1e-9);
          if (order >= 2) close(fit.acceleration, a * 3600, 3600, 1e-9);
          else expect(fit.acceleration).toBeNaN();
        }
      }
    }
  });

  it('lowers the degree where points are few', () => {
    const two = fitPoint(Float64Array.of(0, 2), Float64Array.of(1, 5), 2, 3);
    expect(two.degree).toBe(1);
    expect(two.velocity).toBeCloseTo(2, 12);
    expect(two.acceleration).toBeNaN();
    expect(two.accelerationRoot).toBeNaN();
    const one = fitPoint(Float64Array.of(3), Float64Array.of(7), 3, 2);
    expect(one.position).toBe(7);
    expect(one.velocity).toBeNaN();
    expect(one.velocityRoot).toBeNaN();
  });

  it('has the noise gains of even windows: velocity 3 / (m (m + 1) (2 m + 1)) for degree 1 and 2, position 1 / (2 m + 1) for degree 1', () => {
    for (let m = 1; m <= 15; m++) {
      const offsets = Float64Array.from({ length: 2 * m + 1 }, (_, j) => j - m);
      for (const order of [1, 2]) {
        const weights = new FitWeights(offsets.length);
        localWeights(offsets, offsets.length, order, 1, weights, new Float64Array(2 * offsets.length));
        const gain = 3 / (m * (m + 1) * (2 * m + 1));
        close(weights.velocityRoot ** 2, gain, gain, 1e-13);
        if (order === 1) close(weights.positionGain, 1 / (2 * m + 1), 1, 1e-14);
        const sum = weights.velocity.reduce((total, w) => total + w * w, 0);
        close(sum, gain, gain, 1e-13);
      }
    }
  });

  it('agrees with Householder least squares on uneven times, values and noise gains', () => {
    const random = randomStream(4, 'against least squares');
    for (const order of [1, 2, 3]) {
      for (let trial = 0; trial < 40; trial++) {
        const count = order + 2 + Math.floor(8 * random.uniform());
        const times: number[] = [];
        let t = 0;
        for (let j = 0; j < count; j++) {
          t += 0.2 + random.uniform();
          times.push(t);
        }
        const values = times.map(() => random.normal());
        const at = times[Math.floor(random.uniform() * count)]!;
        const columns = order + 1;
        const design = new Float64Array(count * columns);
        for (let j = 0; j < count; j++) {
          for (let k = 0; k < columns; k++) design[j * columns + k] = (times[j]! - at) ** k;
        }
        const solver = new LeastSquares(design, count, columns);
        const parameters = solver.solve(Float64Array.from(values));
        const factor = solver.covarianceFactor();
        const fit = fitPoint(Float64Array.from(times), Float64Array.from(values), at, order);
        close(fit.position, parameters[0]!, 1, 1e-10);
        close(fit.velocity, parameters[1]!, 1 + Math.abs(parameters[1]!), 1e-10);
        close(fit.positionRoot, Math.sqrt(factor[0]!), 1, 1e-10);
        close(fit.velocityRoot, Math.sqrt(factor[columns + 1]!), 1 + fit.velocityRoot, 1e-10);
        if (order >= 2) {
          close(fit.acceleration, 2 * parameters[2]!, 1 + Math.abs(parameters[2]!), 1e-9);
          const root = 2 * Math.sqrt(factor[2 * columns + 2]!);
          close(fit.accelerationRoot, root, 1 + root, 1e-9);
        }
      }
    }
  });

  it('remembers weights without changing a bit, with and without gaps', () => {
    const random = randomStream(5, 'patterns');
    const fresh = new FitWeights(31);
    for (const span of [5, 9, 31]) {
      const table = new WeightTable(span, 2, 1 / 60);
      for (let trial = 0; trial < 200; trial++) {
        const frames: number[] = [];
        for (let f = 0; f < span; f++) if (trial % 3 === 0 || random.uniform() < 0.7) frames.push(1000 + f);
        if (frames.length < 3) continue;
        const frame = Int32Array.from(frames);
        const members = Int32Array.from(frames, (_, j) => j);
        const at = Math.floor(random.uniform() * frames.length);
        // Twice: once made, once remembered.
        table.at(frame, new Float64Array(0), members, frames.length, at);
        const kept = table.at(frame, new Float64Array(0), members, frames.length, at);
        const offsets = Float64Array.from(frames, (f) => f - frames[at]!);
        localWeights(offsets, frames.length, 2, 1 / 60, fresh, new Float64Array(62));
        for (const part of ['position', 'velocity', 'acceleration'] as const) {
          expect(Array.from(kept[part].subarray(0, frames.length))).toEqual(
            Array.from(fresh[part].subarray(0, frames.length)),
          );
        }
        expect([kept.positionRoot, kept.velocityRoot, kept.accelerationRoot]).toEqual([
          fresh.positionRoot,
          fresh.velocityRoot,
          fresh.accelerationRoot,
        ]);
      }
    }
  });
});
