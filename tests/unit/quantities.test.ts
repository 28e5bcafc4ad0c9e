import { parseQuantity, quantityIn } from '@wakeloom/tracker/run/parse-quantity';
import type { Dimension } from '@wakeloom/tracker/run/units';
import { describe, expect, it } from 'vitest';

function codeOf(call: () => unknown): { readonly code: string; readonly message: string } {
  try {
    call();
  } catch (error) {
    return error as { code: string; message: string };
  }
  return { code: 'none', message: '' };
}

describe('quantities', () => {
  const good: readonly [string, Dimension, number, string, number | null][] = [
    ['500 Hz', 'frequency', 500, 'Hz', null],
    ['60 fps', 'frequency', 60, 'Hz', null],
    ['200 1/s', 'frequency', 200, 'Hz', null],
    ['0.05 mm/px', 'scale', 0.05, 'mm/px', null],
    ['0.0500 +- 0.0002 mm/px', 'scale', 0.05, 'mm/px', 0.0002],
    ['0.0500 \u00b1 0.0002 mm/px', 'scale', 0.05, 'mm/px', 0.0002],
    ['60 Hz +- 0.01 Hz', 'frequency', 60, 'Hz', 0.01],
    ['60 Hz +- 0.5 %', 'frequency', 60, 'Hz', 0.3],
    ['0.06 kHz +- 30 Hz', 'frequency', 0.06, 'kHz', 0.03],
    ['60 +- 0 Hz', 'frequency', 60, 'Hz', 0],
    ['20 degC +- 0.2 K', 'temperature', 20, 'degC', 0.2],
    ['400 us', 'time', 400, 'us', null],
    ['400 \u00b5s', 'time', 400, 'us', null],
    ['20 degC', 'temperature', 20, 'degC', null],
    ['20\u00b0C', 'temperature', 20, 'degC', null],
    ['1030 kg/m3', 'density', 1030, 'kg/m3', null],
    ['1.03 g/cm3', 'density', 1.03, 'g/cm3', null],
    ['2 mm', 'length', 2, 'mm', null],
    ['20 \u03bcm', 'length', 20, 'um', null],
    ['1e-3 m', 'length', 0.001, 'm', null],
    ['.5in', 'length', 0.5, 'in', null],
    ['-3 px', 'length', -3, 'px', null],
    ['30 mm/s', 'speed', 30, 'mm/s', null],
    ['5 px/frame', 'speed', 5, 'px/frame', null],
    ['1 cSt', 'viscosity', 1, 'mm2/s', null],
    ['1.0e-6 m2/s', 'viscosity', 1e-6, 'm2/s', null],
    ['2 frames', 'time', 2, 'frame', null],
    ['1.5 deg', 'angle', 1.5, 'deg', null],
    ['1 GB', 'bytes', 1, 'GB', null],
  ];
  it.each(good)('reads %s as %s', (text, dimension, value, unit, spread) => {
    const quantity = parseQuantity(text, dimension);
    expect(quantity).toEqual({ value, unit, standardUncertainty: spread === null ? null : expect.closeTo(spread, 12) });
  });

  it('turns pixels per length over and keeps the relative uncertainty', () => {
    const quantity = parseQuantity('20 +- 0.1 px/mm', 'scale');
    expect(quantity).toMatchObject({ value: 0.05, unit: 'mm/px' });
    expect(quantity.standardUncertainty! / quantity.value).toBeCloseTo(0.1 / 20, 15);
  });

  const bad: readonly [string, Dimension, string, string][] = [
    ['fast', 'frequency', 'usage/quantity', 'expected a frequency'],
    ['', 'length', 'usage/quantity', 'expected a length'],
    ['5', 'length', 'usage/unit', 'the unit is missing'],
    ['5 s', 'length', 'usage/unit', 'is a unit of time'],
    ['5 Mm', 'length', 'usage/unit', 'not known'],
    ['60 hz', 'frequency', 'usage/unit', 'nearest is "Hz"'],
    ['5 +- mm', 'length', 'usage/quantity', 'no figure after'],
    ['5 +- -1 mm', 'length', 'usage/quantity', 'not negative'],
    ['5 mm +- 1 px', 'length', 'usage/unit', 'does not convert'],
    ['0,05 mm/px', 'scale', 'usage/quantity', 'decimal point'],
    ['1e999 mm', 'length', 'usage/quantity', 'too large'],
    ['0 px/mm', 'scale', 'usage/quantity', 'not 0'],
    ['NaN mm', 'length', 'usage/quantity', 'expected a length'],
  ];
  it.each(bad)('refuses %j as %s with %s', (text, dimension, code, words) => {
    const error = codeOf(() => parseQuantity(text, dimension));
    expect(error.code).toBe(code);
    expect(error.message).toContain(words);
    expect(error.message).toMatch(/got .*, expected /);
  });

  it('converts with one rounding between decimal units, and by definition else', () => {
    const into = (text: string, dimension: Dimension, unit: string) =>
      quantityIn(parseQuantity(text, dimension), unit, dimension).value;
    expect(into('20 um', 'length', 'mm')).toBe(0.02);
    expect(into('400 us', 'time', 's')).toBe(0.0004);
    expect(into('0.3 m/s', 'speed', 'mm/s')).toBe(300);
    expect(into('7 mm', 'length', 'm')).toBe(0.007);
    expect(into('1 in', 'length', 'mm')).toBe(25.4);
    expect(into('1 cSt', 'viscosity', 'm2/s')).toBe(1e-6);
    expect(into('1 GiB', 'bytes', 'B')).toBe(2 ** 30);
    expect(into('293.15 K', 'temperature', 'degC')).toBe(20);
    expect(into('1 g/cm3', 'density', 'kg/m3')).toBe(1000);
    expect(into('1 rad', 'angle', 'deg')).toBeCloseTo(180 / Math.PI, 13);
    expect(into('120 mm/min', 'speed', 'mm/s')).toBe(2);
    expect(quantityIn(parseQuantity('20 +- 0.2 degC', 'temperature'), 'K', 'temperature')).toEqual({
      value: 293.15,
      unit: 'K',
      standardUncertainty: 0.2,
    });
  });

  it('does not convert pixels into lengths', () => {
    const error = codeOf(() => quantityIn(parseQuantity('5 px', 'length'), 'mm', 'length'));
    expect(error.code).toBe('usage/unit');
  });
});
