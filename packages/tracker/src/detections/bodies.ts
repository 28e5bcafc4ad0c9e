import { WakeloomError } from '../core/errors.js';
import type { Body } from '../run/settings.js';

/**
 * Signed distance from a point to the surface of a body, in the length unit of the results: negative inside,
 * zero on the surface. In a volume bodies stand as prisms along z, which is not looked at.
 * Polygons may be given in either sense and need not be convex; inside is where a ray crosses an odd number of
 * edges. Cost: one square root for a circle, one a vertex for a polygon. Accuracy: rounding of the coordinates.
 */
export function bodyDistance(body: Body, x: number, y: number): number {
  if (body.kind === 'circle') {
    const dx = x - body.centre[0];
    const dy = y - body.centre[1];
    return Math.sqrt(dx * dx + dy * dy) - body.diameter / 2;
  }
  const points = body.points;
  let nearest = Number.POSITIVE_INFINITY;
  let inside = false;
  let [ax, ay] = points[points.length - 1]!;
  for (const [bx, by] of points) {
    const square = squareToEdge(x, y, ax, ay, bx, by);
    if (square < nearest) nearest = square;
    if (crosses(x, y, ax, ay, bx, by)) inside = !inside;
    ax = bx;
    ay = by;
  }
  const distance = Math.sqrt(nearest);
  return inside ? -distance : distance;
}

/** True where (x, y) lies inside any of the bodies; the surface itself counts as outside. */
export type InsideTest = (x: number, y: number) => boolean;

/**
 * Test made for many points: a box round each body answers most of them. Agrees with `bodyDistance(...) < 0`.
 * Null where there is no body. Throws `geometry/body` for a body that encloses nothing: a diameter that is not
 * positive, fewer than three corners, no area, numbers that are not finite.
 */
export function insideBodies(bodies: readonly Body[]): InsideTest | null {
  if (bodies.length === 0) return null;
  const boxes = new Float64Array(4 * bodies.length);
  for (const [index, body] of bodies.entries()) {
    checkBody(body, index);
    boxes.set(boxOf(body), 4 * index);
  }
  return (x, y) => {
    for (let index = 0; index < bodies.length; index++) {
      const at = 4 * index;
      if (x < boxes[at]! || x > boxes[at + 1]! || y < boxes[at + 2]! || y > boxes[at + 3]!) continue;
      if (bodyDistance(bodies[index]!, x, y) < 0) return true;
    }
    return false;
  };
}

/** Smallest x, largest x, smallest y, largest y. */
function boxOf(body: Body): readonly [number, number, number, number] {
  if (body.kind === 'circle') {
    const radius = body.diameter / 2;
    return [body.centre[0] - radius, body.centre[0] + radius, body.centre[1] - radius, body.centre[1] + radius];
  }
  let [left, bottom] = body.points[0]!;
  let right = left;
  let top = bottom;
  for (const [x, y] of body.points) {
    if (x < left) left = x;
    if (x > right) right = x;
    if (y < bottom) bottom = y;
    if (y > top) top = y;
  }
  return [left, right, bottom, top];
}

/** Square of the distance from a point to the edge a-b. */
function squareToEdge(x: number, y: number, ax: number, ay: number, bx: number, by: number): number {
  const ex = bx - ax;
  const ey = by - ay;
  const length = ex * ex + ey * ey;
  let along = length > 0 ? ((x - ax) * ex + (y - ay) * ey) / length : 0;
  along = Math.max(0, Math.min(along, 1));
  const dx = x - (ax + along * ex);
  const dy = y - (ay + along * ey);
  return dx * dx + dy * dy;
}

/** True where the ray from (x, y) towards +x crosses the edge a-b; half-open in y, so that a corner counts once. */
function crosses(x: number, y: number, ax: number, ay: number, bx: number, by: number): boolean {
  return ay > y !== by > y && x < ax + ((y - ay) / (by - ay)) * (bx - ax);
}

function checkBody(body: Body, index: number): void {
  const where = `(run sheet: body ${index + 1})`;
  if (body.kind === 'circle') {
    if (body.diameter > 0 && [body.diameter, ...body.centre].every(Number.isFinite)) return;
    throw new WakeloomError(
      'geometry/body',
      `circle: got diameter ${body.diameter} at (${body.centre.join(', ')}), expected a positive diameter and a finite centre ${where}`,
      { body: index },
    );
  }
  const { points } = body;
  let area = 0;
  for (let k = 0; k < points.length; k++) {
    const [ax, ay] = points[k]!;
    const [bx, by] = points[(k + 1) % points.length]!;
    const [ox, oy] = points[0]!;
    area += ((ax - ox) * (by - oy) - (bx - ox) * (ay - oy)) / 2;
  }
  if (points.length >= 3 && Number.isFinite(area) && area !== 0) return;
  throw new WakeloomError(
    'geometry/body',
    `polygon: got ${points.length} corners enclosing ${Math.abs(area)}, expected at least 3 finite corners that enclose an area ${where}`,
    { body: index, corners: points.length },
  );
}
