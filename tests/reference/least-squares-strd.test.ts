import { readFileSync } from 'node:fs';
import { LeastSquares } from '@wakeloom/tracker/math/least-squares';
import { describe, expect, it } from 'vitest';

/**
 * NIST/ITL Statistical Reference Datasets, linear regression (public domain): data and certified values in
 * data/reference/strd.json with their source. Certified values carry 15 digits.
 */
interface Regression {
  readonly n: number;
  readonly columns: readonly string[];
  readonly parameters: Readonly<Record<string, { readonly estimate: string; readonly sd: string }>>;
  readonly residual_sd: string;
  readonly r_squared: string;
  readonly data: readonly (readonly string[])[];
}
const file = new URL('../../data/reference/strd.json', import.meta.url);
const { datasets } = JSON.parse(readFileSync(file, 'utf8')) as { datasets: Record<string, Regression> };

/** Terms of each set's model as NIST states it, from the predictors. */
const MODELS: Record<string, (x: readonly number[]) => number[]> = {
  Norris: ([x = 0]) => [1, x],
  Pontius: ([x = 0]) => [1, x, x * x],
  NoInt1: ([x = 0]) => [x],
  Longley: (x) => [1, ...x],
  Wampler1: ([x = 0]) => [1, x, x ** 2, x ** 3, x ** 4, x ** 5],
};

/** 2^-52 */
const EPSILON = 2.220446049250313e-16;

function fitOf(name: string, predictorScale = 1, targetScale = 1) {
  const set = datasets[name]!;
  const target = Float64Array.from(set.data, (row) => Number(row[0]) * targetScale);
  const terms = set.data.map((row) => MODELS[name]!(row.slice(1).map((text) => Number(text) * predictorScale)));
  const columns = terms[0]!.length;
  const fit = new LeastSquares(Float64Array.from(terms.flat()), set.n, columns);
  const parameters = fit.solve(target);
  let squares = 0;
  for (const [i, row] of terms.entries()) {
    const residual = target[i]! - row.reduce((sum, term, k) => sum + term * parameters[k]!, 0);
    squares += residual * residual;
  }
  const covariance = fit.covarianceFactor();
  const variance = squares / (set.n - columns);
  const sd = Array.from({ length: columns }, (_, k) => Math.sqrt(variance * covariance[k * columns + k]!));
  // The weight of each parameter in the fit: itself times the length of its column.
  const lengths = Array.from({ length: columns }, (_, k) => Math.hypot(...terms.map((row) => row[k]!)));
  const evaluation = Math.max(...terms.flatMap((row) => row.map((term, k) => Math.abs(term * parameters[k]!))));
  // About the mean where the model has a constant, about zero where it has none (as NIST does).
  const centre = terms.every((row) => row[0] === 1) ? target.reduce((sum, y) => sum + y, 0) / set.n : 0;
  const spread = target.reduce((sum, y) => sum + (y - centre) * (y - centre), 0);
  return { set, fit, parameters, variance, sd, lengths, evaluation, spread };
}

describe.each(Object.keys(MODELS))('NIST StRD %s', (name) => {
  const { set, fit, parameters, variance, sd, lengths, evaluation, spread } = fitOf(name);
  const certified = Object.values(set.parameters).map((value) => ({
    estimate: Number(value.estimate),
    sd: Number(value.sd),
  }));

  it('gives the certified parameters to the digits their condition allows', () => {
    expect(parameters.length).toBe(certified.length);
    // Backward stable: the error of a column-scaled parameter is about condition * 2^-52 of the largest of them.
    // 5e-15: half a unit in the last of the 15 certified digits.
    const largest = Math.max(...certified.map(({ estimate }, k) => Math.abs(estimate) * lengths[k]!));
    const allowed = fit.condition * EPSILON * largest;
    for (const [k, { estimate }] of certified.entries()) {
      const error = Math.abs(parameters[k]! - estimate);
      expect(error).toBeLessThanOrEqual(allowed / lengths[k]! + 5e-15 * Math.abs(estimate));
      // Whatever the condition: no set may give fewer than nine digits.
      expect(error).toBeLessThanOrEqual(1e-9 * Math.abs(estimate));
    }
  });

  it('gives the certified standard deviations and R squared', () => {
    // Residuals are differences of numbers up to `evaluation`, each rounded: that much of it cannot be told apart.
    const residual = Number(set.residual_sd);
    const rounding = parameters.length * EPSILON * evaluation;
    expect(Math.abs(Math.sqrt(variance) - residual)).toBeLessThanOrEqual(rounding + 5e-15 * residual);
    const covariance = fit.covarianceFactor();
    for (const [k, value] of certified.entries()) {
      const factor = Math.sqrt(covariance[k * parameters.length + k]!);
      const allowed = rounding * factor + fit.condition * EPSILON * value.sd + 5e-15 * value.sd;
      expect(Math.abs(sd[k]! - value.sd)).toBeLessThanOrEqual(allowed);
    }
    const rSquared = 1 - (variance * (set.n - parameters.length)) / spread;
    expect(Math.abs(rSquared - Number(set.r_squared))).toBeLessThanOrEqual(5e-15 + 4 * EPSILON);
  });

  it('gives the same digits for a target and predictors scaled by powers of two', () => {
    const scaled = fitOf(name, 2 ** -30, 2 ** 30);
    // Each term of the model takes its own power of the predictor's scale; the product with the column is the same.
    for (let k = 0; k < parameters.length; k++) {
      expect(scaled.parameters[k]! * scaled.lengths[k]! * 2 ** -30).toBe(parameters[k]! * lengths[k]!);
    }
    expect(scaled.fit.condition).toBe(fit.condition);
  });
});
