import { FLAG } from '../core/columns.js';
import type { Body } from '../run/settings.js';

/**
 * `at-body` where (x, y) lies less than `rim` outside the surface of a body, or inside it. Bodies are prisms along z.
 * Cost: one square root a circle, one squared distance an edge. Only + - * / sqrt.
 */
export function atBody(bodies: readonly Body[], rim: number, x: number, y: number): number {
  for (const body of bodies) {
    if (body.kind === 'circle') {
      const dx = x - body.centre[0];
      const dy = y - body.centre[1];
      if (Math.sqrt(dx * dx + dy * dy) < body.diameter / 2 + rim) return FLAG['at-body'];
      continue;
    }
    const points = body.points;
    let inside = false;
    for (let k = 0; k < points.length; k++) {
      const [ax, ay] = points[k]!;
      const [bx, by] = points[k + 1 === points.length ? 0 : k + 1]!;
      const ex = bx - ax;
      const ey = by - ay;
      const length = ex * ex + ey * ey;
      let share = length > 0 ? ((x - ax) * ex + (y - ay) * ey) / length : 0;
      if (share < 0) share = 0;
      else if (share > 1) share = 1;
      const dx = x - ax - share * ex;
      const dy = y - ay - share * ey;
      if (dx * dx + dy * dy < rim * rim) return FLAG['at-body'];
      // A ray towards +x crosses this edge.
      if (ay > y !== by > y && x < ax + ((y - ay) / ey) * ex) inside = !inside;
    }
    if (inside) return FLAG['at-body'];
  }
  return 0;
}
