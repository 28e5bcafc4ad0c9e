/**
 * Weights of a local polynomial fit at one time: position, velocity and acceleration are weighted sums of the
 * measured positions, and their noise gains are the sums of squared weights (equal to the diagonal of the inverse
 * normal matrix, times the factorials of the derivatives): standard error = sigma sqrt(gain).
 */
export class FitWeights {
  /** Degree of the polynomial that was fitted. */
  degree = 0;
  count = 0;
  /** [count] each, in the order of the times; velocity per time, acceleration per time squared. */
  position: Float64Array;
  velocity: Float64Array;
  /** NaN where degree is below 2. */
  acceleration: Float64Array;
  /** Noise gain of the position at the time of evaluation: the leverage of a sample there that takes part. */
  positionGain = 0;
  /** Square roots of the gains; NaN for what the degree does not give. */
  positionRoot = 0;
  velocityRoot = 0;
  accelerationRoot = 0;

  constructor(capacity: number) {
    this.position = new Float64Array(capacity);
    this.velocity = new Float64Array(capacity);
    this.acceleration = new Float64Array(capacity);
  }
}

/** Polynomials of the fit at the times, one row a degree; scratch that the caller keeps. [2 x capacity] */
export type FitScratch = Float64Array;

/**
 * Least squares of degree `min(order, count - 1)` over `offsets[0 .. count - 1]` (times from the time of
 * evaluation, in units of `unit`, all different), evaluated at offset 0; written into `into`.
 *
 * The polynomials p_k orthogonal on the offsets come from their three-term recurrence (G. E. Forsythe, J. SIAM 5
 * (1957) 74-88): a QR factorisation of the design matrix without forming normal equations, so that large or
 * crowded offsets cost no digits. Weight of sample j for derivative d: sum over k of p_k^(d)(0) p_k(s_j) / |p_k|^2,
 * gain: sum of p_k^(d)(0)^2 / |p_k|^2. For even offsets these are the weights of Savitzky & Golay (1964).
 * Cost about 12 count (degree + 1) operations. Only + - * / sqrt, sums in order of the offsets.
 */
export function localWeights(
  offsets: Float64Array,
  count: number,
  order: number,
  unit: number,
  into: FitWeights,
  scratch: FitScratch,
): void {
  const degree = order < count ? order : count - 1;
  const { position, velocity, acceleration } = into;
  const capacity = scratch.length / 2;
  for (let j = 0; j < count; j++) {
    scratch[j] = 1;
    scratch[capacity + j] = 0;
    position[j] = 1 / count;
    velocity[j] = 0;
    acceleration[j] = 0;
  }
  let now = 0;
  let before = capacity;
  let norm = count;
  let normBefore = 1;
  // Values and derivatives at 0 of this polynomial (q) and the one before (r).
  let q0 = 1;
  let q1 = 0;
  let q2 = 0;
  let r0 = 0;
  let r1 = 0;
  let r2 = 0;
  let gain0 = 1 / count;
  let gain1 = 0;
  let gain2 = 0;
  for (let k = 1; k <= degree; k++) {
    let alpha = 0;
    for (let j = 0; j < count; j++) {
      const p = scratch[now + j]!;
      alpha += offsets[j]! * p * p;
    }
    alpha /= norm;
    const beta = k > 1 ? norm / normBefore : 0;
    normBefore = norm;
    norm = 0;
    for (let j = 0; j < count; j++) {
      const p = (offsets[j]! - alpha) * scratch[now + j]! - beta * scratch[before + j]!;
      scratch[before + j] = p;
      norm += p * p;
    }
    const keep = now;
    now = before;
    before = keep;
    const next0 = -alpha * q0 - beta * r0;
    const next1 = q0 - alpha * q1 - beta * r1;
    const next2 = 2 * q1 - alpha * q2 - beta * r2;
    r0 = q0;
    r1 = q1;
    r2 = q2;
    q0 = next0;
    q1 = next1;
    q2 = next2;
    const c0 = q0 / norm;
    const c1 = q1 / norm;
    const c2 = q2 / norm;
    for (let j = 0; j < count; j++) {
      const p = scratch[now + j]!;
      position[j] = position[j]! + c0 * p;
      velocity[j] = velocity[j]! + c1 * p;
      acceleration[j] = acceleration[j]! + c2 * p;
    }
    gain0 += q0 * c0;
    gain1 += q1 * c1;
    gain2 += q2 * c2;
  }
  const perUnit = 1 / unit;
  const perSquare = perUnit * perUnit;
  for (let j = 0; j < count; j++) {
    velocity[j] = degree >= 1 ? velocity[j]! * perUnit : Number.NaN;
    acceleration[j] = degree >= 2 ? acceleration[j]! * perSquare : Number.NaN;
  }
  into.count = count;
  into.degree = degree;
  into.positionGain = gain0;
  into.positionRoot = Math.sqrt(gain0);
  into.velocityRoot = degree >= 1 ? Math.sqrt(gain1) * perUnit : Number.NaN;
  into.accelerationRoot = degree >= 2 ? Math.sqrt(gain2) * perSquare : Number.NaN;
}

/** A fit at one time. */
export interface PointFit {
  readonly position: number;
  readonly velocity: number;
  readonly acceleration: number;
  /** Standard errors over the standard deviation of the position noise. */
  readonly positionRoot: number;
  readonly velocityRoot: number;
  readonly accelerationRoot: number;
  readonly degree: number;
}

/**
 * Local polynomial least squares of one coordinate: `values` at `times` (any spacing, all different), evaluated at
 * time `at`, degree `order` or, with fewer points, one below their number. Velocity is NaN with one point,
 * acceleration NaN where the degree is below 2. A convenience over `localWeights`, the kernel that the data path uses.
 *
 * @example
 * // x = 1 + 2 t + 3 t^2 at t = 0, 1, 3, seen at t = 1: position 6, velocity 8, acceleration 6
 * fitPoint(Float64Array.of(0, 1, 3), Float64Array.of(1, 6, 34), 1, 2);
 */
export function fitPoint(times: Float64Array, values: Float64Array, at: number, order: number): PointFit {
  const count = times.length;
  const weights = new FitWeights(count);
  const unit = count > 1 ? (times[count - 1]! - times[0]!) / (count - 1) : 1;
  const offsets = times.map((time) => (time - at) / unit);
  localWeights(offsets, count, order, unit, weights, new Float64Array(2 * count));
  // Weights of the position sum to 1 and the others to 0: differences from one value lose fewer digits.
  const base = values[0]!;
  let position = 0;
  let velocity = 0;
  let acceleration = 0;
  for (let j = 0; j < count; j++) {
    const d = values[j]! - base;
    position += weights.position[j]! * d;
    velocity += weights.velocity[j]! * d;
    acceleration += weights.acceleration[j]! * d;
  }
  const { positionRoot, velocityRoot, accelerationRoot, degree } = weights;
  return {
    position: base + position,
    velocity,
    acceleration,
    positionRoot,
    velocityRoot,
    accelerationRoot,
    degree,
  };
}
