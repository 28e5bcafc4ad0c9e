import {
  axisLabel,
  formatBytes,
  formatCount,
  formatDuration,
  formatNumber,
  formatQuantity,
  formatShare,
  formatUncertain,
  formatUnit,
} from '@wakeloom/tracker/figures/number-format';
import { niceStep, niceTicks, tickLabel } from '@wakeloom/tracker/figures/ticks';
import { describe, expect, it } from 'vitest';

const thin = (text: string) => text.replaceAll('_', '\u2009');

describe('number format', () => {
  it.each([
    [28.3149, 4, '28.31'],
    [9.9996, 4, '10.00'],
    [-0.00123456, 3, '−0.00123'],
    [12345, 3, thin('12_345')],
    [12345.678, 3, thin('12_300')],
    [1234, 4, '1234'],
    [0, 4, '0'],
    [3.2e-7, 3, '3.20e−7'],
    [-4.5e12, 2, '−4.5e12'],
    [Number.NaN, 4, '–'],
    [Number.POSITIVE_INFINITY, 4, '∞'],
  ])('%f to %i digits is %s', (value, digits, text) => {
    expect(formatNumber(value, digits)).toBe(text);
  });

  it('sets thousands of counts apart', () => {
    expect(formatCount(1_200_012)).toBe(thin('1_200_012'));
    expect(formatCount(999)).toBe('999');
    expect(formatCount(Number.NaN)).toBe('–');
  });

  it('gives an uncertainty two digits and the value the same place (GUM 7.2.6)', () => {
    expect(formatUncertain(29.8312, 0.1234)).toBe('29.83 ± 0.12');
    expect(formatUncertain(29831.2, 123.4)).toBe(thin('29_830 ± 120'));
    expect(formatUncertain(1, 0.0996)).toBe('1.00 ± 0.10');
    expect(formatUncertain(-0.04, 0.21)).toBe('−0.04 ± 0.21');
    expect(formatUncertain(2.5, null)).toBe('2.500');
    expect(formatUncertain(2.5, 0)).toBe('2.500');
  });

  it('prints units with their powers and signs', () => {
    expect(formatUnit('mm2/s2')).toBe('mm²/s²');
    expect(formatUnit('1/s')).toBe('1/s');
    expect(formatUnit('kg/m3')).toBe('kg/m³');
    expect(formatUnit('um')).toBe('µm');
    expect(formatUnit('degC')).toBe('°C');
    expect(formatUnit('1')).toBe('');
    expect(formatQuantity(30.5, 'mm/s')).toBe('30.50 mm/s');
    expect(axisLabel('speed', 'mm/s')).toBe('speed / (mm/s)');
    expect(axisLabel('x', 'mm')).toBe('x / mm');
    expect(axisLabel('samples', '1')).toBe('samples');
  });

  it('says shares, durations and sizes plainly', () => {
    expect(formatShare(0.9987)).toBe('99.9 %');
    expect(formatShare(0.0421)).toBe('4.2 %');
    expect(formatShare(1e-6)).toBe('< 0.01 %');
    expect(formatShare(0)).toBe('0 %');
    expect(formatDuration(3.21)).toBe('3.2 s');
    expect(formatDuration(59.7)).toBe('1 min 00 s');
    expect(formatDuration(185)).toBe('3 min 05 s');
    expect(formatDuration(7800)).toBe('2 h 10 min');
    expect(formatBytes(999)).toBe('999 B');
    expect(formatBytes(12_345_678)).toBe('12.3 MB');
  });
});

describe('ticks', () => {
  it('are round, inside the range, and few', () => {
    expect(niceTicks(-12.5, 51.5, 6)).toEqual({ values: [0, 20, 40], step: 20, decimals: 0 });
    expect(niceTicks(0, 1, 5).values.map((value) => value.toFixed(1))).toEqual([
      '0.0',
      '0.2',
      '0.4',
      '0.6',
      '0.8',
      '1.0',
    ]);
    expect(niceTicks(0.30001, 0.30009, 4).step).toBeCloseTo(2e-5, 12);
  });

  it('stay right when the range is scaled by powers of ten', () => {
    for (const scale of [1e-9, 1, 1e9]) {
      const { values, step } = niceTicks(-1.3 * scale, 2.7 * scale, 5);
      expect(step / scale).toBeCloseTo(1, 9);
      expect(values.map((value) => Math.round(value / scale))).toEqual([-1, 0, 1, 2]);
    }
  });

  it('give one tick for an empty range and none for NaN', () => {
    expect(niceTicks(3, 3).values).toEqual([3]);
    expect(niceTicks(Number.NaN, 1).values).toEqual([]);
  });

  it('steps are 1, 2 or 5 times a power of ten, not below what was asked', () => {
    expect([0.11, 0.2, 0.21, 0.5, 0.51, 1, 3].map((raw) => Number(niceStep(raw).toPrecision(12)))).toEqual([
      0.2, 0.2, 0.5, 0.5, 1, 1, 5,
    ]);
  });

  it('are labelled with the decimals of their axis', () => {
    const ticks = niceTicks(-0.5, 0.5, 5);
    expect(ticks.values.map((value) => tickLabel(value, ticks))).toEqual(['−0.4', '−0.2', '0', '0.2', '0.4']);
    expect(tickLabel(2e7, niceTicks(0, 4e7, 4))).toBe('2e7');
    expect(tickLabel(-2e-8, niceTicks(-4e-8, 0, 4))).toBe('−2e−8');
  });
});
