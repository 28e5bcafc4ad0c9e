import { WakeloomError } from '../core/errors.js';
import { convexHull } from '../math/convex-hull.js';
import type { GeometrySettings } from '../run/settings.js';
import type { CoordinateMap } from './geometry.js';
import { PLANAR_MODELS, type PlanarModel, type PointPairs } from './planar-maps.js';
import { type PointNorm, pointNorm } from './point-norm.js';

/** The control-point form of the geometry settings. */
export type ControlPointGeometry = Extract<GeometrySettings, { kind: 'control-points' }>;

/** A map fitted to control points. Residuals are true minus mapped, in the length unit of the results. */
export interface FittedMap {
  /** Maps dump to result coordinates; NaN beyond the horizon of a projective map. z is not touched. */
  readonly map: CoordinateMap;
  /** [points] each, in the order of the run sheet. */
  readonly residualX: Float64Array;
  readonly residualY: Float64Array;
  /**
   * Standard deviation of one coordinate of a control point about the map:
   * sqrt(sum of squared residuals / (2 points - unknowns)). NaN where there are no more points than needed.
   */
  readonly rms: number;
  /** Convex hull of the points in dump coordinates, counter-clockwise: x, y in turn. */
  readonly hull: Float64Array;
}

/**
 * Fits the map named in the settings to the control points by least squares, in coordinates that are centred
 * and brought to unit spread on both sides, so that units and offsets do not matter.
 *
 * Throws `geometry/control-points-too-few` (affine needs 3, projective 4, second order 6, third order 10),
 * `geometry/control-points-collinear` where dump or true points lie on one line,
 * `geometry/control-points-degenerate` where they do not determine the map in another way (too few distinct
 * rows or columns, three of four on one line, all on one conic), `geometry/control-points-not-finite`.
 */
export function fitControlPoints(geometry: ControlPointGeometry): FittedMap {
  const model = PLANAR_MODELS[geometry.map];
  const columns = toColumns(geometry);
  const from = pointNorm(columns.x, columns.y, 'dump');
  const to = pointNorm(columns.u, columns.v, 'true');
  const points = normalisePairs(columns, from, to);
  const parameters = model.fit(points, null);
  if (parameters === null) throw degenerate(geometry);
  const [residualX, residualY] = residuals(model, parameters, points, to);
  return {
    map: compile(model, parameters, from, to),
    residualX,
    residualY,
    rms: rmsOf(residualX, residualY, 2 * columns.x.length - model.unknowns),
    hull: convexHull(columns.x, columns.y),
  };
}

/**
 * Residual of each control point about the map fitted to all the others: what the map is worth between its
 * points. NaN where the others do not determine the map. [points] each, new. Cost: one refit a point (a
 * thousand points with a projective map take about a second).
 */
export function leaveOneOut(geometry: ControlPointGeometry): { readonly x: Float64Array; readonly y: Float64Array } {
  const model = PLANAR_MODELS[geometry.map];
  const columns = toColumns(geometry);
  const from = pointNorm(columns.x, columns.y, 'dump');
  const to = pointNorm(columns.u, columns.v, 'true');
  const points = normalisePairs(columns, from, to);
  const start = model.fit(points, null);
  if (start === null) throw degenerate(geometry);
  const n = points.x.length;
  const x = new Float64Array(n).fill(Number.NaN);
  const y = new Float64Array(n).fill(Number.NaN);
  for (let i = 0; i < n; i++) {
    const parameters = model.fit(without(points, i), start);
    if (parameters === null) continue;
    const [rx, ry] = residuals(model, parameters, points, to);
    x[i] = rx[i]!;
    y[i] = ry[i]!;
  }
  return { x, y };
}

function toColumns({ map, points }: ControlPointGeometry): PointPairs {
  const { fewest } = PLANAR_MODELS[map];
  if (points.length < fewest) {
    throw new WakeloomError(
      'geometry/control-points-too-few',
      `control points: got ${points.length}, expected at least ${fewest} for the map "${map}", better twice as many so that their residuals tell its error (run sheet: geometry, control points)`,
      { points: points.length, needed: fewest, map },
    );
  }
  const bad = points.findIndex((point) => !point.every(Number.isFinite));
  if (bad >= 0) {
    throw new WakeloomError(
      'geometry/control-points-not-finite',
      `control point ${bad + 1}: got (${points[bad]!.join(', ')}), expected four finite numbers: dump x, dump y, true x, true y (run sheet: geometry, control points)`,
      { point: bad + 1 },
    );
  }
  const column = (k: 0 | 1 | 2 | 3) => Float64Array.from(points, (point) => point[k]);
  return { x: column(0), y: column(1), u: column(2), v: column(3) };
}

function normalisePairs({ x, y, u, v }: PointPairs, from: PointNorm, to: PointNorm): PointPairs {
  return {
    x: x.map((value) => (value - from.cx) * from.s),
    y: y.map((value) => (value - from.cy) * from.s),
    u: u.map((value) => (value - to.cx) * to.s),
    v: v.map((value) => (value - to.cy) * to.s),
  };
}

/** True minus mapped, back in the length unit of the results. */
function residuals(
  model: PlanarModel,
  parameters: Float64Array,
  { x, y, u, v }: PointPairs,
  to: PointNorm,
): readonly [Float64Array, Float64Array] {
  const at = new Float64Array(2);
  const rx = new Float64Array(x.length);
  const ry = new Float64Array(x.length);
  for (let i = 0; i < x.length; i++) {
    model.evaluate(parameters, x[i]!, y[i]!, at);
    rx[i] = (u[i]! - at[0]!) / to.s;
    ry[i] = (v[i]! - at[1]!) / to.s;
  }
  return [rx, ry];
}

function compile(model: PlanarModel, parameters: Float64Array, from: PointNorm, to: PointNorm): CoordinateMap {
  const at = new Float64Array(2);
  return (x, y, _z, rows) => {
    for (let i = 0; i < rows; i++) {
      model.evaluate(parameters, (x[i]! - from.cx) * from.s, (y[i]! - from.cy) * from.s, at);
      x[i] = at[0]! / to.s + to.cx + 0;
      y[i] = at[1]! / to.s + to.cy + 0;
    }
  };
}

function rmsOf(x: Float64Array, y: Float64Array, freedom: number): number {
  if (freedom <= 0) return Number.NaN;
  let sum = 0;
  for (let i = 0; i < x.length; i++) sum += x[i]! * x[i]! + y[i]! * y[i]!;
  return Math.sqrt(sum / freedom);
}

function without({ x, y, u, v }: PointPairs, leave: number): PointPairs {
  const others = (_: number, i: number) => i !== leave;
  return { x: x.filter(others), y: y.filter(others), u: u.filter(others), v: v.filter(others) };
}

function degenerate({ map, points }: ControlPointGeometry): WakeloomError {
  return new WakeloomError(
    'geometry/control-points-degenerate',
    `control points: got ${points.length} that do not determine the map "${map}", expected points spread over the field in more rows and columns than the order of the map, no three of four on one line; or choose a simpler map (run sheet: geometry, control points)`,
    { points: points.length, map },
  );
}
