import type { Flow } from './flow.js';

/** Uniform stream (speedX, speedY[, speedZ]); three numbers make a 3-D flow. Pathlines are straight. */
export function uniformFlow(speedX: number, speedY: number, speedZ?: number): Flow {
  return {
    name: 'uniform',
    dims: speedZ === undefined ? 2 : 3,
    velocity(_x, _y, _z, _t, into) {
      into[0] = speedX;
      into[1] = speedY;
      if (speedZ !== undefined) into[2] = speedZ;
    },
  };
}

/** Uniform shear u = speed + rate y, v = 0. Vorticity -rate; pathlines are straight at constant speed. */
export function shearFlow(rate: number, speed = 0): Flow {
  return {
    name: 'shear',
    dims: 2,
    velocity(_x, y, _z, _t, into) {
      into[0] = speed + rate * y;
      into[1] = 0;
    },
  };
}

/** Solid rotation about (centreX, centreY): u = -rate dy, v = rate dx. Vorticity 2 rate, acceleration -rate^2 r. */
export function solidRotation(rate: number, centreX = 0, centreY = 0): Flow {
  return {
    name: 'solid rotation',
    dims: 2,
    velocity(x, y, _z, _t, into) {
      into[0] = -rate * (y - centreY);
      into[1] = rate * (x - centreX);
    },
  };
}

/**
 * All particles move alike: displacement sum over k of coefficientsX[k] t^(k + 1) / (k + 1), that is velocity
 * coefficientsX[0] + coefficientsX[1] t + ..., and so in y. Coefficient k in length / s^(k + 1). A local
 * polynomial fit of one degree more than the last coefficient's power is exact on it.
 */
export function polynomialMotion(coefficientsX: readonly number[], coefficientsY: readonly number[]): Flow {
  return {
    name: 'polynomial motion',
    dims: 2,
    velocity(_x, _y, _z, t, into) {
      into[0] = horner(coefficientsX, t);
      into[1] = horner(coefficientsY, t);
    },
  };
}

function horner(coefficients: readonly number[], t: number): number {
  let sum = 0;
  for (let k = coefficients.length - 1; k >= 0; k--) sum = sum * t + coefficients[k];
  return sum;
}

/**
 * Plane stagnation flow u = k x, v = -k y. Potential; pathlines x0 e^(kt), y0 e^(-kt); acceleration k^2 (x, y).
 * Derivable: psi = k x y.
 */
export function stagnationFlow(rate: number): Flow {
  return {
    name: 'plane stagnation',
    dims: 2,
    velocity(x, y, _z, _t, into) {
      into[0] = rate * x;
      into[1] = -rate * y;
    },
  };
}

/**
 * Plane Poiseuille flow of mean speed U between walls at y = 0 and y = gap: u = 6 U (y/gap)(1 - y/gap).
 * Solid beyond the walls. Derivable from mu u'' = dp/dx; maximum 1.5 U.
 */
export function poiseuilleChannel(meanSpeed: number, gap: number): Flow {
  return {
    name: 'plane Poiseuille',
    dims: 2,
    velocity(_x, y, _z, _t, into) {
      const share = y / gap;
      into[0] = share > 0 && share < 1 ? 6 * meanSpeed * share * (1 - share) : 0;
      into[1] = 0;
    },
    inside: (_x, y) => y < 0 || y > gap,
  };
}

/**
 * Travelling transverse wave u = U0, v = V0 sin(omega (t - x/U0)): path, streak and stream lines all differ.
 * A particle that left the origin at time tau moves on the straight line y = x (V0/U0) sin(omega tau).
 * Derivable: x - U0 t is constant along a pathline, hence so is v.
 */
export function travellingWave(speed: number, amplitude: number, angularFrequency: number): Flow {
  return {
    name: 'travelling wave',
    dims: 2,
    velocity(x, _y, _z, t, into) {
      into[0] = speed;
      into[1] = amplitude * Math.sin(angularFrequency * (t - x / speed));
    },
  };
}
