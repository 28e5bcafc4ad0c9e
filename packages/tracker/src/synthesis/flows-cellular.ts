import type { Flow } from './flow.js';

/**
 * Taylor-Green cells: u = -U cos kx sin ky F, v = U sin kx cos ky F, F = e^(-2 nu k^2 t), so that
 * psi = (U/k) cos kx cos ky F with u = dpsi/dy, v = -dpsi/dx. G. I. Taylor & A. E. Green, Proc. R. Soc. A 158
 * (1937) 499-521. Kinetic energy decays as e^(-4 nu k^2 t).
 */
export function taylorGreen(speed: number, wavenumber: number, kinematicViscosity = 0): Flow {
  return {
    name: 'Taylor-Green',
    dims: 2,
    velocity(x, y, _z, t, into) {
      const scale = speed * Math.exp(-2 * kinematicViscosity * wavenumber * wavenumber * t);
      into[0] = -scale * Math.cos(wavenumber * x) * Math.sin(wavenumber * y);
      into[1] = scale * Math.sin(wavenumber * x) * Math.cos(wavenumber * y);
    },
  };
}

/**
 * Double gyre on [0, 2] x [0, 1]: psi = A sin(pi f) sin(pi y), f = e sin(wt) x^2 + (1 - 2 e sin(wt)) x,
 * with the sign of its authors, u = -dpsi/dy, v = dpsi/dx. S. C. Shadden, F. Lekien & J. E. Marsden, Physica D
 * 212 (2005) 271-304. Defaults: A 0.1, e 0.25, w 2 pi / 10.
 */
export function doubleGyre(amplitude = 0.1, epsilon = 0.25, angularFrequency = (2 * Math.PI) / 10): Flow {
  return {
    name: 'double gyre',
    dims: 2,
    velocity(x, y, _z, t, into) {
      const a = epsilon * Math.sin(angularFrequency * t);
      const b = 1 - 2 * a;
      const f = (a * x + b) * x;
      const slope = 2 * a * x + b;
      into[0] = -Math.PI * amplitude * Math.sin(Math.PI * f) * Math.cos(Math.PI * y);
      into[1] = Math.PI * amplitude * Math.cos(Math.PI * f) * Math.sin(Math.PI * y) * slope;
    },
  };
}

/**
 * ABC flow (Arnold, Beltrami, Childress): u = A sin z + C cos y, v = B sin x + A cos z, w = C sin y + B cos x.
 * Its curl is itself. T. Dombre et al., J. Fluid Mech. 167 (1986) 353-391 (formula from memory).
 */
export function abcFlow(a = Math.sqrt(3), b = Math.SQRT2, c = 1): Flow {
  return {
    name: 'ABC',
    dims: 3,
    velocity(x, y, z, _t, into) {
      into[0] = a * Math.sin(z) + c * Math.cos(y);
      into[1] = b * Math.sin(x) + a * Math.cos(z);
      into[2] = c * Math.sin(y) + b * Math.cos(x);
    },
  };
}
