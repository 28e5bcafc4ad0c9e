import type { Flow } from './flow.js';

/**
 * Classical fourth-order Runge-Kutta (W. Kutta, Z. Math. Phys. 46 (1901) 435-453) in `substeps` equal steps over
 * `interval`. The returned function moves `position` (length at least `dims`) in place from time t on. Local error of the fifth
 * order in interval / substeps.
 */
export function rungeKutta(
  flow: Flow,
  interval: number,
  substeps: number,
): (position: Float64Array, t: number) => void {
  const { dims } = flow;
  const h = interval / substeps;
  const k1 = new Float64Array(3);
  const k2 = new Float64Array(3);
  const k3 = new Float64Array(3);
  const k4 = new Float64Array(3);
  return (p, t) => {
    for (let s = 0; s < substeps; s++) {
      const now = t + s * h;
      const x = p[0];
      const y = p[1];
      const z = dims === 3 ? p[2] : 0;
      flow.velocity(x, y, z, now, k1);
      flow.velocity(x + 0.5 * h * k1[0], y + 0.5 * h * k1[1], z + 0.5 * h * k1[2], now + 0.5 * h, k2);
      flow.velocity(x + 0.5 * h * k2[0], y + 0.5 * h * k2[1], z + 0.5 * h * k2[2], now + 0.5 * h, k3);
      flow.velocity(x + h * k3[0], y + h * k3[1], z + h * k3[2], now + h, k4);
      p[0] = x + (h / 6) * (k1[0] + 2 * k2[0] + 2 * k3[0] + k4[0]);
      p[1] = y + (h / 6) * (k1[1] + 2 * k2[1] + 2 * k3[1] + k4[1]);
      if (dims === 3) p[2] = z + (h / 6) * (k1[2] + 2 * k2[2] + 2 * k3[2] + k4[2]);
    }
  };
}
