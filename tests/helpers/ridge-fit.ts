import { LeastSquares } from '@wakeloom/tracker/math/least-squares';

/** Velocities seen at places, each with a trust. z and w are zero in the plane. */
export interface SeenLink {
  readonly at: readonly [number, number, number];
  readonly velocity: readonly [number, number, number];
  readonly trust: number;
}

/** What a ridged quadratic fit about a place gives, from the definition. */
export interface RidgeFit {
  /** Coefficients of u, v, w in terms 1, x, y(, z), then the products, offsets in units of the radius. */
  readonly coefficients: readonly Float64Array[];
  /** Velocity at the place. */
  readonly value: readonly number[];
  /** Gradients at the place, one row of d/dx d/dy d/dz for each of u, v, w. */
  readonly slope: readonly (readonly number[])[];
  /** Sum of the weights. */
  readonly weight: number;
  /** Top left entry of the inverse of the ridged normal matrix. */
  readonly leverage: number;
  /** Variance of the value where all links have the variance one. */
  readonly variance: number;
  /** Weighted squared residuals and ridge times squared coefficients, w counted over depth noise. */
  readonly residual: number;
  /** Condition number of the ridged design, columns scaled. */
  readonly condition: number;
}

/** Terms of a full quadratic in a scaled offset. */
export function quadraticTerms(dims: 2 | 3, dx: number, dy: number, dz: number): number[] {
  if (dims === 2) return [1, dx, dy, dx * dx, dx * dy, dy * dy];
  return [1, dx, dy, dz, dx * dx, dx * dy, dy * dy, dx * dz, dy * dz, dz * dz];
}

/** Ridge of each term: none on the constant. */
export function ridgeOf(dims: 2 | 3, linear: number, quadratic: number): number[] {
  return quadraticTerms(dims, 1, 1, 1).map((_, m) => (m === 0 ? 0 : m <= dims ? linear : quadratic));
}

/**
 * The fit about `place` of all links within the ellipsoid of `radius` in plane and `radius` times `depthNoise` along
 * z, weights trust (1 - r^2)^2, as an ordinary least-squares problem: a row for each link times the root of its
 * weight, a row for each ridge. Solved by orthogonal reflections, not by normal equations. Null: no link is within.
 */
export function ridgeFit(
  dims: 2 | 3,
  links: readonly SeenLink[],
  place: readonly [number, number, number],
  radius: number,
  depthNoise: number,
  ridge: readonly number[],
): RidgeFit | null {
  const size = [radius, radius, radius * depthNoise];
  const rows: number[][] = [];
  const seen: number[][] = [];
  const weights: number[] = [];
  for (const { at, velocity, trust } of links) {
    const d = at.map((value, axis) => (axis < dims ? (value - place[axis]) / size[axis] : 0));
    const inside = 1 - d[0] * d[0] - d[1] * d[1] - d[2] * d[2];
    if (inside <= 0) continue;
    const weight = inside * inside * trust;
    const root = Math.sqrt(weight);
    weights.push(weight);
    rows.push(quadraticTerms(dims, d[0], d[1], d[2]).map((term) => root * term));
    seen.push(velocity.map((component) => root * component));
  }
  const linkRows = rows.length;
  if (linkRows === 0) return null;
  for (const [m, penalty] of ridge.entries()) {
    if (penalty === 0) continue;
    rows.push(ridge.map((_, n) => (n === m ? Math.sqrt(penalty) : 0)));
    seen.push([0, 0, 0]);
  }
  const terms = ridge.length;
  const solver = new LeastSquares(Float64Array.from(rows.flat()), rows.length, terms);
  const coefficients: Float64Array[] = [];
  let residual = 0;
  for (let axis = 0; axis < dims; axis++) {
    const one = solver.solve(Float64Array.from(seen, (row) => row[axis]));
    coefficients.push(one);
    const unit = axis === 2 ? 1 / depthNoise : 1;
    for (const [n, row] of rows.entries()) {
      const off = unit * (seen[n][axis] - row.reduce((sum, factor, m) => sum + factor * one[m], 0));
      residual += off * off;
    }
  }
  let variance = 0;
  for (let n = 0; n < linkRows; n++) {
    const only = new Float64Array(rows.length);
    only[n] = Math.sqrt(weights[n]);
    variance += solver.solve(only)[0] ** 2;
  }
  return {
    coefficients,
    value: coefficients.map((one) => one[0]),
    slope: coefficients.map((one) => size.slice(0, dims).map((length, axis) => one[1 + axis] / length)),
    weight: weights.reduce((sum, weight) => sum + weight, 0),
    leverage: solver.covarianceFactor()[0],
    variance,
    residual,
    condition: solver.condition,
  };
}
