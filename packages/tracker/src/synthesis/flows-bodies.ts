import type { Flow } from './flow.js';

/**
 * Potential flow past a circular cylinder of the given radius at the origin, stream U along +x:
 * u = U (1 - a^2 (x^2 - y^2) / r^4), v = -2 U a^2 x y / r^4 (derivable from psi = U y (1 - a^2/r^2)).
 * With a counter-clockwise circulation, -Gamma y / (2 pi r^2) and Gamma x / (2 pi r^2) are added.
 */
export function potentialCylinder(speed: number, radius: number, circulation = 0): Flow {
  const radius2 = radius * radius;
  const turn = circulation / (2 * Math.PI);
  return {
    name: 'potential flow past a cylinder',
    dims: 2,
    velocity(x, y, _z, _t, into) {
      const r2 = x * x + y * y;
      if (r2 < radius2) {
        into[0] = 0;
        into[1] = 0;
        return;
      }
      const share = radius2 / (r2 * r2);
      into[0] = speed * (1 - share * (x * x - y * y)) - (turn * y) / r2;
      into[1] = -2 * speed * share * x * y + (turn * x) / r2;
    },
    inside: (x, y) => x * x + y * y < radius2,
  };
}

/** Shape of a vortex street. Lengths and speeds in the units of the run. */
export interface VortexStreet {
  /** Distance between vortices of one row, along x. */
  readonly spacing: number;
  /** Distance of the rows. Von Karman's (1911) stable ratio to the spacing: arccosh(sqrt 2) / pi = 0.2805499. */
  readonly gap?: number;
  /** Magnitude of each vortex' circulation; the upper row turns clockwise, as behind a body in a stream along +x. */
  readonly circulation: number;
  /** Speed of the stream far from the rows, along +x. */
  readonly speed: number;
  /** Radius that smooths the cores; the velocity is finite everywhere. 0 gives point vortices. */
  readonly coreRadius: number;
}

/** Von Karman's stable ratio of row distance to spacing, arccosh(sqrt 2) / pi (von Karman 1911). */
export const STABLE_STREET_RATIO = Math.acosh(Math.SQRT2) / Math.PI;

/**
 * Infinite Karman street, carried along as a whole. An infinite row of vortices Gamma at spacing l has
 * u = -(Gamma/2l) sinh(2 pi y/l) / (cosh(2 pi y/l) - cos(2 pi x/l)), v = (Gamma/2l) sin(2 pi x/l) / (the same)
 * (Lamb, Hydrodynamics (1932) section 156). The core adds q = 2 (pi rc / l)^2 to the denominator: with
 * cosh - cos ~ 2 pi^2 r^2 / l^2 near a vortex this is Gamma / (2 pi) times r / (r^2 + rc^2) there. The smoothed
 * field is still u = dpsi/dy, v = -dpsi/dx with psi = -(Gamma/4 pi) ln(cosh - cos + q), so divergence stays 0.
 * The rows move at speed - (Gamma/2l) tanh(pi h/l) exactly for point vortices; the smoothed rows are carried at
 * the velocity they induce on each other's centres, so that the cores stay where the fluid moves with them.
 */
export function vortexStreet(shape: VortexStreet): Flow {
  const { spacing, circulation, speed, coreRadius } = shape;
  const gap = shape.gap ?? STABLE_STREET_RATIO * spacing;
  const wave = (2 * Math.PI) / spacing;
  const smooth = 2 * (Math.PI * (coreRadius / spacing)) ** 2;
  const half = circulation / (2 * spacing);
  // Speed a row gets from the other: the cores lie half a spacing apart along x, a gap apart along y.
  const induced = (-half * Math.sinh(wave * gap)) / (Math.cosh(wave * gap) + 1 + smooth);
  const carried = speed + induced;
  return {
    name: 'vortex street',
    dims: 2,
    velocity(x, y, _z, t, into) {
      const phase = wave * (x - carried * t);
      // Upper row (clockwise, -Gamma) at x = 0; lower row (+Gamma) half a spacing on.
      const up = wave * (y - 0.5 * gap);
      const low = wave * (y + 0.5 * gap);
      const nearUp = Math.cosh(up) - Math.cos(phase) + smooth;
      const nearLow = Math.cosh(low) + Math.cos(phase) + smooth;
      into[0] = speed + half * (Math.sinh(up) / nearUp - Math.sinh(low) / nearLow);
      into[1] = -half * (Math.sin(phase) / nearUp + Math.sin(phase) / nearLow);
    },
  };
}
