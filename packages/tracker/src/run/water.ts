import { WakeloomError } from '../core/errors.js';

/** Density and viscosity of fresh water at one temperature and 0.1 MPa. */
export interface WaterProperties {
  /** kg/m3 */
  readonly density: number;
  /** Pa s */
  readonly dynamicViscosity: number;
  /** m2/s */
  readonly kinematicViscosity: number;
}

// IAPWS SR6-08(2011), Table 1 and eq. 2 (specific volume at 0.1 MPa); J. Patek et al. (2009), J. Phys. Chem. Ref.
// Data 38, 21-29. The gas constant, reference temperature and pressure belong to the formula.
const GAS_CONSTANT = 461.51805; // J/(kg K)
const REFERENCE_TEMPERATURE = 10; // K
const REFERENCE_PRESSURE = 1e5; // Pa
const UPPER_POLE = 593; // K
const LOWER_POLE = 232; // K
const CONSTANT_TERM = 1.93763157e-2;
/** Factor and exponent of powers of T_R / (T_a - T). */
const UPPER_TERMS: readonly (readonly [number, number])[] = [
  [6.74458446e3, 4],
  [-2.22521604e5, 5],
  [1.00231247e8, 7],
  [-1.63552118e9, 8],
  [8.32299658e9, 9],
];
/** Factor and exponent of powers of T_R / (T - T_b). */
const LOWER_TERMS: readonly (readonly [number, number])[] = [
  [5.78545292e-3, 1],
  [-1.53195665e-2, 2],
  [3.11337859e-2, 3],
  [-4.23546241e-2, 4],
  [3.38713507e-2, 5],
  [-1.19946761e-2, 6],
];

/** SR6-08 eq. 7: dynamic viscosity in uPa s as factors and exponents of T / 300 K. */
const VISCOSITY_TERMS: readonly (readonly [number, number])[] = [
  [280.68, -1.9],
  [511.45, -7.7],
  [61.131, -19.6],
  [0.45903, -40],
];

function sumOfPowers(terms: readonly (readonly [number, number])[], base: number): number {
  let sum = 0;
  for (const [factor, exponent] of terms) sum += factor * base ** exponent;
  return sum;
}

/**
 * Density and viscosity of pure, air-free fresh water at 0.1 MPa after IAPWS SR6-08(2011). `temperature` in degC.
 * Accuracy of the formulation between 0 and 50 degC: density 1 part in 10^5 or better, viscosity 1 %; at the
 * normal pressure of 101.325 kPa the density is 6 parts in 10^7 higher. Code `usage/water-temperature` outside 0 to
 * 100 degC (the formula reaches farther, water in an open tunnel does not).
 */
export function waterProperties(temperature: number): WaterProperties {
  if (!(temperature >= 0 && temperature <= 100)) {
    throw new WakeloomError(
      'usage/water-temperature',
      `water temperature: got ${temperature} degC, expected 0 to 100 degC (liquid water at 0.1 MPa)`,
      { temperature },
    );
  }
  const kelvin = temperature + 273.15;
  const upper = sumOfPowers(UPPER_TERMS, REFERENCE_TEMPERATURE / (UPPER_POLE - kelvin));
  const lower = sumOfPowers(LOWER_TERMS, REFERENCE_TEMPERATURE / (kelvin - LOWER_POLE));
  const volume = ((GAS_CONSTANT * REFERENCE_TEMPERATURE) / REFERENCE_PRESSURE) * (CONSTANT_TERM + upper + lower);
  const dynamicViscosity = 1e-6 * sumOfPowers(VISCOSITY_TERMS, kelvin / 300);
  return { density: 1 / volume, dynamicViscosity, kinematicViscosity: dynamicViscosity * volume };
}
