import { LeastSquares } from '@wakeloom/tracker/math/least-squares';
import { describe, expect, it } from 'vitest';
import { uniform } from '../helpers/detections.js';

/** Random design [rows x columns] and target. */
function randomProblem(rows: number, columns: number, seed: number) {
  const random = uniform(seed);
  const column = (n: number) => Float64Array.from({ length: n }, () => random() - 0.5);
  return { design: column(rows * columns), target: column(rows) };
}

describe('least squares', () => {
  it('solves a square system exactly solvable in whole numbers', () => {
    const fit = new LeastSquares(Float64Array.of(1, 0, 1, 1, 1, 2), 3, 2);
    const [constant, slope] = fit.solve(Float64Array.of(1, 3, 5));
    expect(constant).toBeCloseTo(1, 14);
    expect(slope).toBeCloseTo(2, 14);
    expect(fit.rank).toBe(2);
  });

  it('leaves a residual orthogonal to every column', () => {
    const { design, target } = randomProblem(40, 7, 1);
    const p = new LeastSquares(design, 40, 7).solve(target);
    const residual = target.map((b, i) => b - p.reduce((sum, value, k) => sum + design[i * 7 + k]! * value, 0));
    for (let k = 0; k < 7; k++) {
      expect(Math.abs(residual.reduce((sum, r, i) => sum + r * design[i * 7 + k]!, 0))).toBeLessThan(1e-14);
    }
  });

  it('gives the inverse of the normal matrix', () => {
    const { design } = randomProblem(30, 5, 2);
    const covariance = new LeastSquares(design, 30, 5).covarianceFactor();
    for (let a = 0; a < 5; a++) {
      for (let b = 0; b < 5; b++) {
        let product = 0;
        for (let k = 0; k < 5; k++) {
          let normal = 0;
          for (let i = 0; i < 30; i++) normal += design[i * 5 + a]! * design[i * 5 + k]!;
          product += normal * covariance[k * 5 + b]!;
        }
        expect(product).toBeCloseTo(a === b ? 1 : 0, 12);
      }
    }
  });

  it('gives leverages that turn residuals into those of a refit without the row', () => {
    const rows = 25;
    const { design, target } = randomProblem(rows, 4, 3);
    const fit = new LeastSquares(design, rows, 4);
    const p = fit.solve(target);
    const leverage = fit.leverage();
    expect(leverage.reduce((sum, h) => sum + h, 0)).toBeCloseTo(4, 12);
    const residual = (i: number, q: Float64Array) =>
      target[i]! - q.reduce((sum, value, k) => sum + design[i * 4 + k]! * value, 0);
    for (let leave = 0; leave < rows; leave++) {
      const others = design.filter((_, at) => Math.floor(at / 4) !== leave);
      const refit = new LeastSquares(others, rows - 1, 4).solve(target.filter((_, i) => i !== leave));
      expect(residual(leave, p) / (1 - leverage[leave]!)).toBeCloseTo(residual(leave, refit), 12);
    }
  });

  it.each([1e-9, 1, 1e9])('solves the same hard problem in units of %s', (unit) => {
    // Cubic about far-off places: columns differ by 18 orders of magnitude in size.
    const places = [1, 1.1, 1.3, 1.4, 1.7, 1.9, 2].map((x) => x * unit);
    const design = Float64Array.from(places.flatMap((x) => [1, x, x * x, x * x * x]));
    const target = Float64Array.from(places, (x) => 3 + x / unit - 2 * (x / unit) ** 2 + 0.5 * (x / unit) ** 3);
    const fit = new LeastSquares(design, places.length, 4);
    const p = fit.solve(target);
    // Condition about 1e4 times 2.2e-16, with room for the growth of sums over seven rows.
    expect(fit.condition).toBeLessThan(3e4);
    const expected = [3, 1, -2, 0.5];
    for (const [k, value] of expected.entries()) {
      expect(Math.abs(p[k]! * unit ** k - value)).toBeLessThan(3e4 * 2.2e-16 * 7);
    }
  });

  it.each([1e-200, 1e200])('neither overflows nor vanishes at %s', (unit) => {
    const { design, target } = randomProblem(12, 3, 4);
    const plain = new LeastSquares(design, 12, 3).solve(target);
    const p = new LeastSquares(
      design.map((value) => value * unit),
      12,
      3,
    ).solve(target);
    for (let k = 0; k < 3; k++) expect((p[k]! * unit) / plain[k]!).toBeCloseTo(1, 12);
  });

  it('counts the rank and refuses to solve what is not determined', () => {
    // The third column is the sum of the first two.
    const { design } = randomProblem(10, 3, 5);
    for (let i = 0; i < 10; i++) design[3 * i + 2] = design[3 * i]! + design[3 * i + 1]!;
    const fit = new LeastSquares(design, 10, 3);
    expect(fit.rank).toBe(2);
    expect(fit.condition).toBe(Number.POSITIVE_INFINITY);
    const code = { code: 'run/least-squares-rank' };
    expect(() => fit.solve(new Float64Array(10))).toThrow(expect.objectContaining(code));
    expect(() => fit.covarianceFactor()).toThrow(expect.objectContaining(code));
    expect(() => fit.leverage()).toThrow(expect.objectContaining(code));
    expect(new LeastSquares(new Float64Array(8), 4, 2).rank).toBe(0);
  });

  it('refuses shapes and numbers it cannot use', () => {
    expect(() => new LeastSquares(new Float64Array(4), 2, 3)).toThrow(
      expect.objectContaining({ code: 'run/least-squares-shape' }),
    );
    expect(() => new LeastSquares(new Float64Array(3), 2, 2)).toThrow(
      expect.objectContaining({ code: 'run/least-squares-shape' }),
    );
    expect(() => new LeastSquares(Float64Array.of(1, Number.NaN), 2, 1)).toThrow(
      expect.objectContaining({ code: 'run/least-squares-not-finite', details: { row: 1 } }),
    );
  });
});
