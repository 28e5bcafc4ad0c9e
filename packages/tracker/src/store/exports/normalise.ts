import { WakeloomError } from '../../core/errors.js';

/** Length and speed that results are divided by, in the units of the results. */
export interface Normalisation {
  readonly length: number;
  readonly speed: number;
}

/** Units that results carry. */
export interface ResultUnits {
  readonly length: string;
  readonly time: string;
}

/** Powers of length and time in a unit made of the run's two: `mm2/s2` is 2 and -2. Null for any other unit. */
export function unitPowers(
  unit: string,
  units: ResultUnits,
): { readonly length: number; readonly time: number } | null {
  const powers = { length: 0, time: 0 };
  const [above = '', below = '', more] = unit.split('/');
  if (more !== undefined) return null;
  for (const [part, sign] of [
    [above, 1],
    [below, -1],
  ] as const) {
    if (part === '' || part === '1') continue;
    const found = /^([A-Za-z]+)(\d?)$/.exec(part);
    if (found === null) return null;
    const power = sign * Number(found[2] === '' ? 1 : found[2]);
    if (found[1] === units.length) powers.length += power;
    else if (found[1] === units.time) powers.time += power;
    else return null;
  }
  return powers;
}

/**
 * What figures in `unit` are divided by: x / L, u / U, t U / L, a L / U^2, stresses / U^2, gradients L / U. Code
 * `usage/normalise` when length or speed is not above zero, or the unit is not one of the run's.
 */
export function divisorFor(unit: string, units: ResultUnits, normalise: Normalisation): number {
  const { length, speed } = normalise;
  if (!(length > 0 && speed > 0 && Number.isFinite(length) && Number.isFinite(speed))) {
    throw new WakeloomError(
      'usage/normalise',
      `normalisation: got length ${length} and speed ${speed}, expected both above zero`,
      { length, speed },
    );
  }
  const powers = unitPowers(unit, units);
  if (powers === null) {
    throw new WakeloomError(
      'usage/normalise',
      `normalisation: got a column in ${unit}, expected powers of ${units.length} and ${units.time}`,
      { unit },
    );
  }
  // T = L / U, so L^p T^q = L^(p + q) U^(-q); the powers are small whole numbers.
  return length ** (powers.length + powers.time) * speed ** -powers.time;
}

/** How an export says that it is normalised. */
export function normalisedRemark(normalise: Normalisation, units: ResultUnits): string {
  return (
    `Figures are divided by a length of ${normalise.length} ${units.length} and a speed of ${normalise.speed} ` +
    `${units.length}/${units.time}: x/L, u/U, t U/L, a L/U2, stresses/U2.`
  );
}
