import { LeastSquares } from '../math/least-squares.js';
import type { GeometrySettings } from '../run/settings.js';

/** Kinds of map from dump to true coordinates that control points can fix. */
export type MapKind = Extract<GeometrySettings, { kind: 'control-points' }>['map'];

/** Pairs of points, dump (x, y) to true (u, v), both centred and brought to unit spread. [n] each */
export interface PointPairs {
  readonly x: Float64Array;
  readonly y: Float64Array;
  readonly u: Float64Array;
  readonly v: Float64Array;
}

/** One kind of map: how it is fitted and how it is evaluated, both in normalised coordinates. */
export interface PlanarModel {
  /** Fewest points that determine it. */
  readonly fewest: number;
  /** Unknowns of both coordinates together. */
  readonly unknowns: number;
  /** Least-squares parameters, or null where the points do not determine them. `start` speeds up a refit. */
  fit(points: PointPairs, start: Float64Array | null): Float64Array | null;
  /** Writes the mapped point to into[0] and into[1]; NaN beyond the horizon of a projective map. */
  evaluate(parameters: Float64Array, x: number, y: number, into: Float64Array): void;
}

/**
 * Largest condition number of a fit that is believed. Control points are read to some 0.01 px in a field of
 * 1000 px, 1e-5 of it (common practice, no source); with a larger condition number that error alone moves
 * the coefficients by their own size.
 */
const CONDITION_LIMIT = 1e5;

/**
 * Change of every coefficient (of size 1 here) below which the iteration ends: each step shrinks the next one by
 * about the residuals over the field, 1e-3 or less, so what is left is below 1e-13.
 */
const SETTLED = 1e-10;

/** Steps after which Gauss-Newton is stopped; from the linear solution it needs about five. */
const STEP_LIMIT = 40;

function polynomial(order: 1 | 2 | 3): PlanarModel {
  const terms = ((order + 1) * (order + 2)) / 2;
  return {
    fewest: terms,
    unknowns: 2 * terms,
    fit({ x, y, u, v }) {
      const n = x.length;
      if (n < terms) return null;
      const design = new Float64Array(n * terms);
      for (let i = 0; i < n; i++) design.set(polynomialTerms(order, x[i]!, y[i]!), i * terms);
      const qr = new LeastSquares(design, n, terms);
      if (qr.condition > CONDITION_LIMIT) return null;
      const parameters = new Float64Array(2 * terms);
      parameters.set(qr.solve(u));
      parameters.set(qr.solve(v), terms);
      return parameters;
    },
    evaluate(p, x, y, into) {
      let u = p[0]! + p[1]! * x + p[2]! * y;
      let v = p[terms]! + p[terms + 1]! * x + p[terms + 2]! * y;
      if (order >= 2) {
        u += (p[3]! * x + p[4]! * y) * x + p[5]! * y * y;
        v += (p[terms + 3]! * x + p[terms + 4]! * y) * x + p[terms + 5]! * y * y;
      }
      if (order === 3) {
        u += ((p[6]! * x + p[7]! * y) * x + p[8]! * y * y) * x + p[9]! * y * y * y;
        v += ((p[16]! * x + p[17]! * y) * x + p[18]! * y * y) * x + p[19]! * y * y * y;
      }
      into[0] = u;
      into[1] = v;
    },
  };
}

/** 1, x, y, x^2, xy, y^2, x^3, x^2 y, x y^2, y^3 as far as the order goes. */
function polynomialTerms(order: 1 | 2 | 3, x: number, y: number): number[] {
  const terms = [1, x, y];
  if (order >= 2) terms.push(x * x, x * y, y * y);
  if (order === 3) terms.push(x * x * x, x * x * y, x * y * y, y * y * y);
  return terms;
}

/**
 * Projective map u = (a x + b y + c) / w, v = (d x + e y + f) / w, w = g x + h y + 1. The 1 loses no map: in
 * centred coordinates w is its value at the centroid, which is never on the horizon of points in front of it.
 * Started by the direct linear transform on normalised points (Hartley 1997, doi:10.1109/34.601246), then
 * Gauss-Newton on the distances in true coordinates (Hartley & Zisserman, Multiple View Geometry, 2nd ed.,
 * section 4.2.2, error in one image).
 */
const PROJECTIVE: PlanarModel = {
  fewest: 4,
  unknowns: 8,
  fit(points, start) {
    const n = points.x.length;
    if (n < 4) return null;
    const first = start ?? linearProjective(points);
    if (first === null || !inFront(first, points)) return null;
    let p: Float64Array = first;
    let error = projectiveError(p, points);
    for (let step = 0; step < STEP_LIMIT; step++) {
      const change = gaussNewtonStep(p, points);
      if (change === null) return null;
      let next: Float64Array = p;
      let nextError = Number.POSITIVE_INFINITY;
      // Halve a step that goes too far; 30 halvings are below rounding.
      for (let part = 1; part > 1e-9; part /= 2) {
        next = added(p, part, change);
        nextError = inFront(next, points) ? projectiveError(next, points) : Number.POSITIVE_INFINITY;
        if (nextError < error) break;
      }
      if (!(nextError < error)) break;
      p = next;
      error = nextError;
      if (change.every((value) => Math.abs(value) <= SETTLED)) break;
    }
    return p;
  },
  evaluate(p, x, y, into) {
    const w = p[6]! * x + p[7]! * y + 1;
    const inverse = w > 0 ? 1 / w : Number.NaN;
    into[0] = (p[0]! * x + p[1]! * y + p[2]!) * inverse;
    into[1] = (p[3]! * x + p[4]! * y + p[5]!) * inverse;
  },
};

function linearProjective({ x, y, u, v }: PointPairs): Float64Array | null {
  const n = x.length;
  const design = new Float64Array(16 * n);
  const target = new Float64Array(2 * n);
  for (let i = 0; i < n; i++) {
    const [px, py, pu, pv] = [x[i]!, y[i]!, u[i]!, v[i]!];
    design.set([px, py, 1, 0, 0, 0, -pu * px, -pu * py, 0, 0, 0, px, py, 1, -pv * px, -pv * py], 16 * i);
    target[2 * i] = pu;
    target[2 * i + 1] = pv;
  }
  const qr = new LeastSquares(design, 2 * n, 8);
  return qr.condition > CONDITION_LIMIT ? null : qr.solve(target);
}

function gaussNewtonStep(p: Float64Array, { x, y, u, v }: PointPairs): Float64Array | null {
  const n = x.length;
  const design = new Float64Array(16 * n);
  const target = new Float64Array(2 * n);
  const at = new Float64Array(2);
  for (let i = 0; i < n; i++) {
    const [px, py] = [x[i]!, y[i]!];
    PROJECTIVE.evaluate(p, px, py, at);
    const w = p[6]! * px + p[7]! * py + 1;
    const [qx, qy, one] = [px / w, py / w, 1 / w];
    design.set(
      [qx, qy, one, 0, 0, 0, -at[0]! * qx, -at[0]! * qy, 0, 0, 0, qx, qy, one, -at[1]! * qx, -at[1]! * qy],
      16 * i,
    );
    target[2 * i] = u[i]! - at[0]!;
    target[2 * i + 1] = v[i]! - at[1]!;
  }
  const qr = new LeastSquares(design, 2 * n, 8);
  return qr.condition > CONDITION_LIMIT ? null : qr.solve(target);
}

function added(p: Float64Array, part: number, change: Float64Array): Float64Array {
  return p.map((value, k) => value + part * change[k]!);
}

function projectiveError(p: Float64Array, { x, y, u, v }: PointPairs): number {
  const at = new Float64Array(2);
  let sum = 0;
  for (let i = 0; i < x.length; i++) {
    PROJECTIVE.evaluate(p, x[i]!, y[i]!, at);
    sum += (u[i]! - at[0]!) * (u[i]! - at[0]!) + (v[i]! - at[1]!) * (v[i]! - at[1]!);
  }
  return sum;
}

/** True where all points lie on the near side of the horizon, as points seen by one camera do. */
function inFront(p: Float64Array, { x, y }: PointPairs): boolean {
  for (let i = 0; i < x.length; i++) if (!(p[6]! * x[i]! + p[7]! * y[i]! + 1 > 0)) return false;
  return true;
}

/** Every kind of map by its name in the run sheet. */
export const PLANAR_MODELS: Readonly<Record<MapKind, PlanarModel>> = {
  affine: polynomial(1),
  projective: PROJECTIVE,
  'polynomial-2': polynomial(2),
  'polynomial-3': polynomial(3),
};
