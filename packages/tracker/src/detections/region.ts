import type { Dims } from '../core/columns.js';
import { WakeloomError } from '../core/errors.js';
import type { Region } from '../run/settings.js';

/** Lower and upper bound of each axis, both included. An open side is the largest finite number. */
export interface RegionBounds {
  readonly min: readonly [number, number, number];
  readonly max: readonly [number, number, number];
}

const OPEN: readonly [number, number] = [-Number.MAX_VALUE, Number.MAX_VALUE];

/**
 * Bounds of the region of interest. A side that is not given is open up to the largest finite number, so that
 * the one comparison `min <= x && x <= max` also refuses NaN and Infinity, which a map may make of absurd
 * coordinates. In the plane z is not looked at.
 * Throws `geometry/region` where a lower bound is not below the upper one.
 */
export function regionBounds(region: Region | null, dims: Dims): RegionBounds {
  const sides = [region?.x ?? OPEN, region?.y ?? OPEN, (dims === 3 ? region?.z : null) ?? OPEN] as const;
  for (const [axis, side] of sides.entries()) {
    if (side[0] < side[1]) continue;
    const name = 'xyz'.charAt(axis);
    throw new WakeloomError(
      'geometry/region',
      `region of interest: got ${side[0]} to ${side[1]} along ${name}, expected the smaller number first (run sheet: geometry, region)`,
      { axis: name, from: side[0], to: side[1] },
    );
  }
  return {
    min: [sides[0][0], sides[1][0], sides[2][0]],
    max: [sides[0][1], sides[1][1], sides[2][1]],
  };
}
