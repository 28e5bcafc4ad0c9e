import { medianOfFew, SIGMA_PER_MEDIAN } from '../math/median.js';
import type { NearestFew } from '../math/nearest-few.js';
import type { PlaneTest } from './plane-test.js';

/**
 * Robust standard deviations of the local spread that a sample must stand out by. Medians of seven, the smaller of two,
 * come out about a quarter below the spread, so 6 stands for 4.5 of the true ones. Measured (tests/property/
 * screening-turbulence): of Gaussian velocities without any correlation between neighbours 0.6 % are set aside and their
 * mean square comes out 2 % low; of velocities replaced at random 96 to 99 % are found, in fluctuations as in shear.
 */
const STANDS_OUT = 6;

/** Fewest neighbours whose own spreads tell one. */
const FEWEST_SPREADS = 3;

/**
 * Whether a sample stands out of the spread round it. The normalised median test takes the spread from the same few
 * neighbours as the median: eight of them often lie together by chance, and where velocities of neighbours are not
 * correlated (turbulence that the seeding does not resolve) it would set aside a third of good samples and the stresses
 * with them. So what fails it is held against the spread round each of its neighbours, the sample itself left out: the
 * median of theirs stands on two or three times as many samples. Each is the smaller of the median distance from the
 * median, which another outlier does not move, and of that from a plane, which a gradient does not move.
 * Mutable scratch: one a user. Cost about 3 us, for samples that fail the test only.
 */
export class LocalSpread {
  private readonly search: NearestFew;
  private readonly plane: PlaneTest;
  private readonly values: Float64Array;
  private readonly votes = new Int32Array(3);

  constructor(search: NearestFew, plane: PlaneTest, neighbours: number) {
    this.search = search;
    this.plane = plane;
    this.values = new Float64Array(neighbours);
  }

  /**
   * `deviation[c]`: how far component c of sample `own` is off, NaN where it passed. The search must know
   * the neighbours of `own`. True where one component stands out.
   */
  standsOut(velocity: readonly Float64Array[], own: number, found: number, deviation: Float64Array): boolean {
    const { search, votes } = this;
    const base = search.k * own;
    votes.fill(0);
    let told = 0;
    // Farther than so many times the median of the spreads: farther than that of more than half of them.
    for (let i = 0; i < found; i++) {
      const other = search.slots[base + i]!;
      const near = search.near(other);
      if (near < FEWEST_SPREADS + 1) continue;
      told++;
      let open = false;
      for (let c = 0; c < 3; c++) {
        if (Number.isNaN(deviation[c]!)) continue;
        const least = deviation[c]! / (STANDS_OUT * SIGMA_PER_MEDIAN);
        if (
          this.beside(velocity[c]!, other, near, own) < least ||
          this.plane.spread(velocity[c]!, other, near, own) < least
        ) {
          votes[c] = votes[c]! + 1;
          if (2 * votes[c]! > found) return true;
        }
        if (2 * (votes[c]! + found - 1 - i) > found) open = true;
      }
      if (!open && told >= FEWEST_SPREADS) return false;
    }
    if (told < FEWEST_SPREADS) return true;
    return 2 * Math.max(votes[0]!, votes[1]!, votes[2]!) > told;
  }

  /** Median distance of the velocities of the neighbours of `other` from their median, `without` left out. */
  private beside(velocity: Float64Array, other: number, near: number, without: number): number {
    const { values, search } = this;
    const base = search.k * other;
    let n = 0;
    for (let i = 0; i < near; i++) {
      const slot = search.slots[base + i]!;
      if (slot !== without) values[n++] = velocity[slot]!;
    }
    const middle = medianOfFew(values, n);
    for (let i = 0; i < n; i++) values[i] = Math.abs(values[i]! - middle);
    return medianOfFew(values, n);
  }
}
