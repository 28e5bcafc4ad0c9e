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
 * Mutable scratch: one a user. Cost about 5 us, for samples that fail the test only.
 */
export class LocalSpread {
  private readonly search: NearestFew;
  private readonly plane: PlaneTest;
  private readonly around: Int32Array;
  private readonly values: Float64Array;
  private readonly spreads: readonly [Float64Array, Float64Array, Float64Array];

  constructor(search: NearestFew, plane: PlaneTest, neighbours: number) {
    this.search = search;
    this.plane = plane;
    this.around = new Int32Array(neighbours);
    this.values = new Float64Array(neighbours);
    this.spreads = [new Float64Array(neighbours), new Float64Array(neighbours), new Float64Array(neighbours)];
  }

  /**
   * `deviation[c]`: how far component c of sample `own` is off, NaN where it passed. Neighbours are those of the last
   * query, which is lost. True where one component stands out.
   */
  standsOut(velocity: readonly Float64Array[], own: number, found: number, deviation: Float64Array): boolean {
    const { search, around, spreads } = this;
    for (let i = 0; i < found; i++) around[i] = search.slots[i]!;
    let count = 0;
    for (let i = 0; i < found; i++) {
      const near = search.near(around[i]!);
      if (near < FEWEST_SPREADS + 1) continue;
      for (let c = 0; c < 3; c++) {
        if (Number.isNaN(deviation[c]!)) continue;
        const beside = this.beside(velocity[c]!, own, near);
        const plane = this.plane.spread(velocity[c]!, around[i]!, near, own);
        // NaN: no plane; then the median alone.
        spreads[c]![count] = Number.isNaN(plane) ? beside : Math.min(plane, beside);
      }
      count++;
    }
    if (count < FEWEST_SPREADS) return true;
    for (let c = 0; c < 3; c++) {
      if (Number.isNaN(deviation[c]!)) continue;
      if (deviation[c]! > STANDS_OUT * SIGMA_PER_MEDIAN * medianOfFew(spreads[c]!, count)) return true;
    }
    return false;
  }

  /** Median distance of the neighbours' velocities from their median, `without` left out. */
  private beside(velocity: Float64Array, without: number, near: number): number {
    const { values, search } = this;
    let n = 0;
    for (let i = 0; i < near; i++) {
      const slot = search.slots[i]!;
      if (slot !== without) values[n++] = velocity[slot]!;
    }
    const middle = medianOfFew(values, n);
    for (let i = 0; i < n; i++) values[i] = Math.abs(values[i]! - middle);
    return medianOfFew(values, n);
  }
}
