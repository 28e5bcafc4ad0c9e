import type { Quantity } from '../core/quantity.js';
import type { GivenSettings } from './given-settings.js';
import { quantityIn } from './parse-quantity.js';
import type { QuantityVector, WrittenPoints } from './setting-kinds.js';

/** Units of a run's results and what a pixel is in them. */
export interface RunUnits {
  readonly length: string;
  readonly time: 's' | 'frame';
  /** Length per dump unit, or null where none is known (no scale: results in px; control points: varies). */
  readonly lengthPerPixel: number | null;
}

/** Picks the units of the results from what is known of scale and clock. */
export function chooseUnits(given: GivenSettings): RunUnits {
  const clock = ['clock.rate', 'clock.times', 'clock.pairs.delay', 'clock.bursts.frames', 'dump.columns.time'];
  const timed = clock.some((key) => given.has(key) && given.value(key) !== false && given.value(key) !== 'auto');
  const time = timed ? 's' : 'frame';
  const scale = given.quantity('geometry.scale');
  if (scale !== null) return { length: scale.unit.split('/')[0]!, time, lengthPerPixel: scale.value };
  const points = given.value('geometry.control-points.points') as WrittenPoints | null;
  if (points !== null) return { length: points.unit ?? 'mm', time, lengthPerPixel: null };
  return { length: 'px', time, lengthPerPixel: null };
}

function why(units: RunUnits): string {
  if (units.length === 'px') return ' (no scale is given, so lengths are in px)';
  return units.time === 'frame' ? ' (no clock is given, so times are in frames)' : '';
}

/** A size in the length unit of the results; one in px is taken through the scale where there is one. */
export function sizeIn(given: GivenSettings, units: RunUnits, key: string, quantity: Quantity): number {
  if (quantity.unit === 'px' && units.length !== 'px') {
    if (units.lengthPerPixel !== null) return quantity.value * units.lengthPerPixel;
    given.problem(
      key,
      `got ${quantity.value} px, expected a length in ${units.length} (a pixel has no one size under control points)`,
    );
    return Number.NaN;
  }
  return placeIn(given, units, key, quantity);
}

/** A coordinate or a size that must be in true length where a scale is given: px would name a place in the dump. */
export function placeIn(given: GivenSettings, units: RunUnits, key: string, quantity: Quantity): number {
  return given.attempt(key, Number.NaN, () => {
    if (quantity.unit === units.length) return quantity.value;
    if ((quantity.unit === 'px') !== (units.length === 'px')) {
      given.problem(key, `got ${quantity.value} ${quantity.unit}, expected a length in ${units.length}${why(units)}`);
      return Number.NaN;
    }
    return quantityIn(quantity, units.length, 'length').value;
  });
}

/** A speed as length unit per time unit of the results. */
export function speedIn(given: GivenSettings, units: RunUnits, key: string, quantity: Quantity): Quantity {
  const unit = `${units.length}/${units.time}`;
  try {
    return quantityIn(quantity, unit, 'speed');
  } catch {
    given.problem(key, `got ${quantity.value} ${quantity.unit}, expected a speed in ${unit}${why(units)}`);
    return quantity;
  }
}

/** The items of a vector as quantities. */
export function itemsOf(vector: QuantityVector): readonly Quantity[] {
  return vector.values.map((value) => ({ value, unit: vector.unit, standardUncertainty: vector.standardUncertainty }));
}
