import { resolveRun } from '@wakeloom/tracker/run/resolve';
import { describe, expect, it } from 'vitest';

describe('a dump with options and no run sheet', () => {
  it('takes rate, scale and bin', () => {
    const { settings, records, assumptions } = resolveRun({
      options: { rate: '500 Hz', scale: '0.05 mm/px', bin: '2 mm' },
      dumpFiles: ['data/run-07.csv.gz'],
    });
    expect(settings.run).toBe('run-07');
    expect(settings.clock).toEqual({ kind: 'rate', rate: { value: 500, unit: 'Hz', standardUncertainty: null } });
    expect(settings.geometry).toMatchObject({ kind: 'scale', scale: { value: 0.05, unit: 'mm/px' }, yAxis: 'up' });
    expect(settings.grid.bin).toEqual([2, 2, 2]);
    expect(settings.units).toEqual({ length: 'mm', time: 's' });
    expect(records.find((record) => record.key === 'clock.rate')).toEqual({
      key: 'clock.rate',
      value: 500,
      unit: 'Hz',
      origin: 'option',
    });
    expect(records.find((record) => record.key === 'linking.bridge')).toMatchObject({ value: 2, origin: 'default' });
    expect(assumptions).toContain('y as written in the dump counts as up.');
  });

  it('stays in px and frames without scale and rate, and says so', () => {
    const { settings, assumptions } = resolveRun({ options: { bin: '16 px', reach: '5 px' }, dumpFiles: ['a.csv'] });
    expect(settings.units).toEqual({ length: 'px', time: 'frame' });
    expect(settings.clock.kind).toBe('none');
    expect(settings.linking.reach).toBe(5);
    expect(assumptions).toContain('No scale is given: lengths are in px.');
    expect(assumptions).toContain('No frame rate is given: times are in frames.');
  });
});
