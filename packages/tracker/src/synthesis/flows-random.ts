import type { Flow } from './flow.js';
import { randomStream } from './random-stream.js';

/** A random field's shape. */
export interface RandomFlowShape {
  /** Root mean square of each velocity component's fluctuation. */
  readonly speed: number;
  /** Longest and shortest wavelength of its modes. */
  readonly longest: number;
  readonly shortest: number;
  /** How fast modes change phase: angular frequency = unsteadiness * speed * wavenumber. 0: frozen. */
  readonly unsteadiness?: number;
  readonly modes?: number;
  readonly meanX?: number;
  readonly meanY?: number;
  readonly seed: number;
}

/**
 * Sum of seeded plane Fourier modes, each divergence-free by itself (velocity across its wave vector):
 * u = mean + sum a_m e_m cos(k_m . x + w_m t + p_m), e_m perpendicular to k_m (R. H. Kraichnan, Phys. Fluids 13
 * (1970) 22-31). Wavenumbers are even in their logarithm and amplitudes fall as k^(-5/6), so that the energy of a
 * logarithmic band falls as k^(-5/3): a choice, not a model of turbulence. Scaled so that the root mean square of
 * each component over space and angles is `speed`.
 */
export function randomFlow(shape: RandomFlowShape): Flow {
  const modes = shape.modes ?? 48;
  const random = randomStream(shape.seed, 'random flow');
  const kx = new Float64Array(modes);
  const ky = new Float64Array(modes);
  const amplitudeX = new Float64Array(modes);
  const amplitudeY = new Float64Array(modes);
  const frequency = new Float64Array(modes);
  const phase = new Float64Array(modes);
  const low = (2 * Math.PI) / shape.longest;
  const ratio = shape.longest / shape.shortest;
  let power = 0;
  for (let m = 0; m < modes; m++) {
    const wavenumber = low * ratio ** ((m + 0.5) / modes);
    const angle = 2 * Math.PI * random.uniform();
    const amplitude = wavenumber ** (-5 / 6);
    kx[m] = wavenumber * Math.cos(angle);
    ky[m] = wavenumber * Math.sin(angle);
    amplitudeX[m] = -amplitude * Math.sin(angle);
    amplitudeY[m] = amplitude * Math.cos(angle);
    frequency[m] = (shape.unsteadiness ?? 0.5) * shape.speed * wavenumber * random.normal();
    phase[m] = 2 * Math.PI * random.uniform();
    power += amplitude * amplitude;
  }
  // A cosine has mean square 1/2, halved again over the two components: speed^2 = scale^2 power / 4.
  const scale = (2 * shape.speed) / Math.sqrt(power);
  const { meanX = 0, meanY = 0 } = shape;
  return {
    name: 'random flow',
    dims: 2,
    velocity(x, y, _z, t, into) {
      let u = 0;
      let v = 0;
      for (let m = 0; m < modes; m++) {
        const wave = Math.cos(kx[m] * x + ky[m] * y + frequency[m] * t + phase[m]);
        u += amplitudeX[m] * wave;
        v += amplitudeY[m] * wave;
      }
      into[0] = meanX + scale * u;
      into[1] = meanY + scale * v;
    },
  };
}
