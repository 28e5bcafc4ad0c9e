import { uniformFloat64 } from 'pure-rand/distribution/uniformFloat64';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import { seedFor } from '../core/context.js';

/** One stream of seeded random numbers. Mutable: hand it to one user only. */
export interface RandomStream {
  /** Even in [0, 1). */
  uniform(): number;
  /** Mean 0, standard deviation 1. */
  normal(): number;
  /** Exponential with mean 1. */
  exponential(): number;
  /** Poisson with the given mean (below 1e6); exact below 30, from a rounded normal above. */
  poisson(mean: number): number;
}

/** The stream that belongs to a seed and a label: streams of different labels are independent for our purposes. */
export function randomStream(seed: number, label: string): RandomStream {
  const generator = xoroshiro128plus(seedFor(seed, label) | 0);
  const uniform = () => uniformFloat64(generator);
  let spare = Number.NaN;
  // G. E. P. Box & M. E. Muller, Ann. Math. Stat. 29 (1958) 610-611: two normals from two evens, one kept back.
  const normal = () => {
    if (!Number.isNaN(spare)) {
      const kept = spare;
      spare = Number.NaN;
      return kept;
    }
    const radius = Math.sqrt(-2 * Math.log(1 - uniform()));
    const angle = 2 * Math.PI * uniform();
    spare = radius * Math.sin(angle);
    return radius * Math.cos(angle);
  };
  return {
    uniform,
    normal,
    exponential: () => -Math.log(1 - uniform()),
    poisson(mean) {
      if (!(mean > 0)) return 0;
      if (mean > 30) return Math.max(0, Math.round(mean + Math.sqrt(mean) * normal()));
      // Count unit-rate exponential waits that fit into `mean` (Knuth, TAOCP 2, section 3.4.1).
      const limit = Math.exp(-mean);
      let product = uniform();
      let count = 0;
      while (product > limit) {
        product *= uniform();
        count++;
      }
      return count;
    },
  };
}
