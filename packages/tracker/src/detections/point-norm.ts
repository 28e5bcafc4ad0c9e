import { WakeloomError } from '../core/errors.js';

/** Centre and inverse spread of points in the plane: (x - cx) * s and (y - cy) * s have mean square 1 on average. */
export interface PointNorm {
  readonly cx: number;
  readonly cy: number;
  readonly s: number;
}

/** Smallest spread across over spread along that counts as an area: 0.01 px in 10 000 px. */
const FLAT = 1e-6;

/**
 * Norm of control points on one side of the map. Throws `geometry/control-points-collinear` where they lie on
 * one line (spread across below 1e-6 of that along) or in one place. Coordinates of any size serve.
 */
export function pointNorm(x: Float64Array, y: Float64Array, side: 'dump' | 'true'): PointNorm {
  const n = x.length;
  const cx = mean(x);
  const cy = mean(y);
  let unit = 0;
  for (let i = 0; i < n; i++) unit = Math.max(unit, Math.abs(x[i]! - cx), Math.abs(y[i]! - cy));
  // Divided by the largest offset first: squares then neither overflow nor vanish.
  const dx = x.map((value) => (value - cx) / unit);
  const dy = y.map((value) => (value - cy) / unit);
  let xx = 0;
  let xy = 0;
  let yy = 0;
  for (let i = 0; i < n; i++) {
    xx += dx[i]! * dx[i]!;
    xy += dx[i]! * dy[i]!;
    yy += dy[i]! * dy[i]!;
  }
  const root = Math.sqrt((xx - yy) * (xx - yy) + 4 * xy * xy);
  // Long principal axis, written for whichever of xx and yy is larger so that nothing cancels.
  const ax = xx >= yy ? xx - yy + root : 2 * xy;
  const ay = xx >= yy ? 2 * xy : yy - xx + root;
  const length = Math.sqrt(ax * ax + ay * ay);
  const along = (xx + yy + root) / 2;
  // Summed from the offsets: as an eigenvalue it would drown in the rounding of the larger one. Where both
  // spreads are equal (length 0) there is no axis and no line.
  let across = length > 0 ? 0 : along;
  for (let i = 0; length > 0 && i < n; i++) {
    const offset = (dy[i]! * ax - dx[i]! * ay) / length;
    across += offset * offset;
  }
  if (!(unit > 0 && Math.sqrt(across / along) > FLAT)) {
    throw new WakeloomError(
      'geometry/control-points-collinear',
      `control points: got ${n} whose ${side} positions lie on one line, expected points spread over the field in both directions (run sheet: geometry, control points)`,
      { points: n, side },
    );
  }
  return { cx, cy, s: 1 / (unit * Math.sqrt((xx + yy) / (2 * n))) };
}

function mean(values: Float64Array): number {
  // About the first value: coordinates with a large offset keep their digits.
  const first = values[0]!;
  let sum = 0;
  for (const value of values) sum += value - first;
  return first + sum / values.length;
}
