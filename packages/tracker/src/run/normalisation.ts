import { WakeloomError } from '../core/errors.js';
import { parseQuantity, quantityIn } from './parse-quantity.js';

/**
 * The length and speed that an export is divided by, from what a person wrote (`5 mm`, `30 mm/s`), in the units of
 * the results. Codes `usage/quantity`, `usage/unit` (not convertible: mm where results are in px), `usage/normalise`
 * where one is not above zero.
 */
export function readNormalisation(
  length: string,
  speed: string,
  units: { readonly length: string; readonly time: string },
): { readonly length: number; readonly speed: number } {
  const inUnits = {
    length: quantityIn(parseQuantity(length, 'length'), units.length, 'length').value,
    speed: quantityIn(parseQuantity(speed, 'speed'), `${units.length}/${units.time}`, 'speed').value,
  };
  if (inUnits.length > 0 && inUnits.speed > 0) return inUnits;
  throw new WakeloomError(
    'usage/normalise',
    `normalisation: got a length of "${length}" and a speed of "${speed}", expected both above zero`,
    { length, speed },
  );
}
