/**
 * Convex hull of points in the plane, counter-clockwise (y up), corners only: x and y in turn. [2 x corners], new
 * Fewer than three corners come back where all points lie on one line. Andrew's monotone chain (A. M. Andrew 1979,
 * Inf. Process. Lett. 9, 216-219). Cost O(n log n). Corners are points of the input, unchanged.
 */
export function convexHull(x: Float64Array, y: Float64Array): Float64Array {
  const order = Array.from(x.keys()).sort((a, b) => x[a]! - x[b]! || y[a]! - y[b]!);
  const half = (rows: readonly number[]): number[] => {
    const chain: number[] = [];
    for (const row of rows) {
      while (chain.length >= 2 && cross(x, y, chain[chain.length - 2]!, chain[chain.length - 1]!, row) <= 0)
        chain.pop();
      chain.push(row);
    }
    chain.pop();
    return chain;
  };
  const corners = [...half(order), ...half(order.toReversed())];
  return Float64Array.from(corners.flatMap((row) => [x[row]!, y[row]!]));
}

function cross(x: Float64Array, y: Float64Array, a: number, b: number, c: number): number {
  return (x[b]! - x[a]!) * (y[c]! - y[a]!) - (y[b]! - y[a]!) * (x[c]! - x[a]!);
}

/** True where (x, y) lies in the hull that `convexHull` gave, border included. Cost: one edge after the other. */
export function inConvexHull(hull: Float64Array, x: number, y: number): boolean {
  const n = hull.length;
  let ax = hull[n - 2]!;
  let ay = hull[n - 1]!;
  for (let k = 0; k < n; k += 2) {
    const bx = hull[k]!;
    const by = hull[k + 1]!;
    if ((bx - ax) * (y - ay) - (by - ay) * (x - ax) < 0) return false;
    ax = bx;
    ay = by;
  }
  return true;
}
