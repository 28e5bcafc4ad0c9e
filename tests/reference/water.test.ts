import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { waterProperties } from '@wakeloom/tracker/run/water';
import { describe, expect, it } from 'vitest';

interface Reference {
  readonly values: readonly {
    readonly temperature_K: number;
    readonly specific_volume_m3_kg: number;
    readonly dynamic_viscosity_uPa_s: number;
  }[];
  readonly table: { readonly rows: readonly (readonly [number, number, number, number])[] };
}

const FILE = join(import.meta.dirname, '../../data/reference/water-iapws.json');
const reference = JSON.parse(readFileSync(FILE, 'utf8')) as Reference;

/** Isothermal compressibility of water, 1/Pa: 4.6e-10 near 20 degC (from memory), here for 1.325 kPa only. */
const COMPRESSIBILITY = 4.6e-10;

describe('water after IAPWS SR6-08', () => {
  it('gives the published volume and viscosity at 298.15 K to the last printed digit', () => {
    const [check] = reference.values;
    const { density, dynamicViscosity } = waterProperties(check!.temperature_K - 273.15);
    expect(Math.abs(1 / density - check!.specific_volume_m3_kg)).toBeLessThan(0.5e-11);
    expect(Math.abs(dynamicViscosity * 1e6 - check!.dynamic_viscosity_uPa_s)).toBeLessThan(0.5e-6);
  });

  it('follows the table from 10 to 30 degC', () => {
    expect(reference.table.rows).toHaveLength(21);
    for (const [temperature, sr6, tanaka, viscosity] of reference.table.rows) {
      const water = waterProperties(temperature);
      const raised = water.density * (1 + COMPRESSIBILITY * 1325);
      // Half a unit of the printed digit, and 5 % of the pressure step for the compressibility.
      expect(Math.abs(raised - sr6)).toBeLessThan(1e-4);
      // The two formulations differ by at most 0.0006 kg/m3 in this range.
      expect(Math.abs(raised - tanaka)).toBeLessThan(7e-4);
      expect(Math.abs(water.dynamicViscosity * 1e3 - viscosity)).toBeLessThan(0.6e-6);
      expect(water.kinematicViscosity).toBeCloseTo(water.dynamicViscosity / water.density, 18);
    }
  });

  it('loses 2.4 % of kinematic viscosity a kelvin at 20 degC', () => {
    const slope = waterProperties(20.5).kinematicViscosity / waterProperties(19.5).kinematicViscosity - 1;
    expect(slope).toBeGreaterThan(-0.0245);
    expect(slope).toBeLessThan(-0.0235);
  });

  it.each([-1, 100.1, Number.NaN])('refuses %s degC', (temperature) => {
    expect(() => waterProperties(temperature)).toThrow(expect.objectContaining({ code: 'usage/water-temperature' }));
  });
});
