import type { Flow } from './flow.js';

/** Where a plane vortex lies and what it rides on. Circulation is counter-clockwise positive. */
export interface VortexPlace {
  readonly centreX?: number;
  readonly centreY?: number;
  /** Uniform velocity the vortex is carried with. */
  readonly driftX?: number;
  readonly driftY?: number;
}

/** Plane flow of one axisymmetric vortex whose u_theta / r is `turn(r^2, t)`, carried by its drift. */
function planeVortex(name: string, turn: (r2: number, t: number) => number, place: VortexPlace): Flow {
  const { centreX = 0, centreY = 0, driftX = 0, driftY = 0 } = place;
  return {
    name,
    dims: 2,
    velocity(x, y, _z, t, into) {
      const dx = x - centreX - driftX * t;
      const dy = y - centreY - driftY * t;
      const rate = turn(dx * dx + dy * dy, t);
      into[0] = driftX - rate * dy;
      into[1] = driftY + rate * dx;
    },
  };
}

/** (1 - e^(-s)) / s, smooth through s = 0; -expm1 keeps it exact to rounding for small s. */
function decayQuotient(s: number): number {
  return s === 0 ? 1 : -Math.expm1(-s) / s;
}

/**
 * Lamb-Oseen vortex: u_theta = Gamma / (2 pi r) (1 - e^(-r^2/rc^2)), rc^2 = startRadius^2 + 4 nu t.
 * Lamb, Hydrodynamics (1932) section 334a; Oseen (1912). Largest speed at 1.12090642 rc.
 */
export function lambOseen(
  circulation: number,
  startRadius: number,
  kinematicViscosity: number,
  place: VortexPlace = {},
): Flow {
  const turn = (r2: number, t: number) => {
    const core2 = startRadius * startRadius + 4 * kinematicViscosity * t;
    return (circulation / (2 * Math.PI * core2)) * decayQuotient(r2 / core2);
  };
  return planeVortex('Lamb-Oseen', turn, place);
}

/**
 * Rankine vortex: u_theta = Gamma r / (2 pi a^2) inside the core radius a, Gamma / (2 pi r) outside.
 * Vorticity Gamma / (pi a^2) inside, 0 outside. Derivable.
 */
export function rankineVortex(circulation: number, coreRadius: number, place: VortexPlace = {}): Flow {
  const core2 = coreRadius * coreRadius;
  const turn = (r2: number) => circulation / (2 * Math.PI * Math.max(r2, core2));
  return planeVortex('Rankine vortex', turn, place);
}

/**
 * Burgers vortex along z in an axial strain: u_r = -gamma r / 2, u_z = throughSpeed + gamma z,
 * u_theta = Gamma / (2 pi r) (1 - e^(-gamma r^2 / (4 nu))). J. M. Burgers, Adv. Appl. Mech. 1 (1948) 171-199.
 * Steady and divergence-free; a through-flow merely moves the plane u_z = 0 to z = -throughSpeed / gamma.
 * Largest swirl at r = 2.24181284556 sqrt(nu / gamma).
 */
export function burgersVortex(
  circulation: number,
  strainRate: number,
  kinematicViscosity: number,
  throughSpeed = 0,
): Flow {
  const core2 = (4 * kinematicViscosity) / strainRate;
  return {
    name: 'Burgers vortex',
    dims: 3,
    velocity(x, y, z, _t, into) {
      const rate = (circulation / (2 * Math.PI * core2)) * decayQuotient((x * x + y * y) / core2);
      into[0] = -0.5 * strainRate * x - rate * y;
      into[1] = -0.5 * strainRate * y + rate * x;
      into[2] = throughSpeed + strainRate * z;
    },
  };
}
