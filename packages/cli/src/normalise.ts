import { WakeloomError } from '@wakeloom/tracker/core/errors';
import { parseQuantity, quantityIn } from '@wakeloom/tracker/run/parse-quantity';
import type { Normalisation, ResultUnits } from '@wakeloom/tracker/store/exports/normalise';

/**
 * Length and speed from `5 mm, 30 mm/s`, in the units of the result. Code `usage/normalise` where there are not two
 * figures, one is not above zero, or a unit does not convert.
 */
export function readNormalisation(text: string, units: ResultUnits): Normalisation {
  const parts = text.split(',').map((part) => part.trim());
  const refuse = (why: string, cause?: unknown): never => {
    throw new WakeloomError(
      'usage/normalise',
      `--normalise: got "${text}", expected a length and a speed above zero such as "5 mm, 30 mm/s" (${why})`,
      { text },
      cause,
    );
  };
  if (parts.length !== 2) return refuse(`${parts.length} ${parts.length === 1 ? 'figure' : 'figures'}`);
  const take = (part: string, unit: string, dimension: 'length' | 'speed'): number => {
    try {
      const { value } = quantityIn(parseQuantity(part, dimension), unit, dimension);
      return value > 0 ? value : refuse(`${part} is not above zero`);
    } catch (error) {
      return refuse((error as Error).message, error);
    }
  };
  return {
    length: take(parts[0]!, units.length, 'length'),
    speed: take(parts[1]!, `${units.length}/${units.time}`, 'speed'),
  };
}
