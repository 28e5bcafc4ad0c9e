import { editDistance, nearestWord } from '@wakeloom/tracker/core/nearest-word';
import { SETTING_TABLE } from '@wakeloom/tracker/run/options';
import { readSetting } from '@wakeloom/tracker/run/read-setting';
import { resolveRun } from '@wakeloom/tracker/run/resolve';
import { settingsMarkdown } from '@wakeloom/tracker/run/settings-table';
import { describe, expect, it } from 'vitest';

describe('table of settings', () => {
  it('names each setting and each option once', () => {
    const keys = SETTING_TABLE.map((row) => row.key);
    const options = SETTING_TABLE.map((row) => row.option);
    expect(new Set(keys).size).toBe(keys.length);
    expect(new Set(options).size).toBe(options.length);
    for (const row of SETTING_TABLE) {
      expect(row.option).toMatch(/^[a-z][a-z-]*$/);
      expect(row.option).not.toContain('memory');
      expect(row.help).not.toMatch(/[^.]\.$/);
    }
    // A key is either a setting or a group of settings, never both.
    for (const key of keys) expect(keys.some((other) => other.startsWith(`${key}.`))).toBe(false);
  });

  it.each(SETTING_TABLE.map((row) => [row.key, row] as const))('%s reads its own example and default', (_key, row) => {
    const example = readSetting(row, row.example);
    expect(example).not.toBeNull();
    expect(example).toBeDefined();
    if (row.default !== null) expect(readSetting(row, row.default)).not.toBeNull();
  });

  it('has a line for every setting in the documentation', () => {
    const lines = settingsMarkdown().trimEnd().split('\n');
    expect(lines).toHaveLength(SETTING_TABLE.length + 2);
    for (const row of SETTING_TABLE) {
      const option = row.key === 'dump.files' ? '(the words after `process`)' : `\`--${row.option}\``;
      expect(lines.some((line) => line.startsWith(`| \`${row.key}\` | ${option} |`))).toBe(true);
    }
  });

  it('records every setting with its origin', () => {
    const { records } = resolveRun({ dumpFiles: ['a.csv'] });
    expect(records.map((record) => record.key)).toEqual(SETTING_TABLE.map((row) => row.key));
    expect(records.every((record) => record.origin === 'default')).toBe(true);
  });
});

describe('options', () => {
  it('reports all problems of options at once, with the nearest name', () => {
    const call = () => resolveRun({ options: { rate: '60 Herz', bin: '2 s', raet: '5 Hz', span: 4 }, dumpFiles: [] });
    expect(call).toThrow(expect.objectContaining({ code: 'usage/settings' }));
    try {
      call();
    } catch (error) {
      const { problems } = (error as { details: { problems: string[] } }).details;
      expect(problems).toHaveLength(4);
      expect(problems[0]).toBe('--raet: got an unknown option, expected a known one (nearest is --rate)');
      expect(problems[1]).toMatch(/^--rate: got "60 Herz", expected a frequency above zero/);
      expect(problems[2]).toMatch(/^--span: got "4", expected an odd whole number/);
      expect(problems[3]).toMatch(/^--bin: got "2 s", expected/);
    }
  });

  it('takes reach and bin in px through the scale, in axes of their own', () => {
    const { settings } = resolveRun({ options: { scale: '0.5 mm/px', reach: '4 px', bin: '8, 4 px' } });
    expect(settings.linking.reach).toBe(2);
    expect(settings.grid.bin).toEqual([4, 2, 4]);
  });

  it('takes digits as the position of a column, words as its name', () => {
    const { settings } = resolveRun({ options: { 'x-column': '2', 'y-column': 'y_px', 'z-column': 'none' } });
    expect(settings.dump.columns).toMatchObject({ frame: 'auto', x: 2, y: 'y_px', z: null });
  });

  it('makes a named time column the clock, unless a rate is given', () => {
    expect(resolveRun({ options: { 'time-column': 't' } }).settings.clock).toEqual({ kind: 'times' });
    expect(resolveRun({ options: { 'time-column': 't' } }).settings.units.time).toBe('s');
    expect(resolveRun({ options: { 'time-column': 't', rate: '9 Hz' } }).settings.clock.kind).toBe('rate');
    expect(resolveRun({ options: { 'time-column': 'none' } }).settings.clock.kind).toBe('none');
  });

  it('reads bodies, control points and notes from one option each', () => {
    const body = 'circle 0, 0, 5 mm and polygon 0 0; 5 0; 5 5 mm';
    const { settings } = resolveRun({ options: { scale: '1 mm/px', body, notes: 'operator: lab 3; run-number: 12' } });
    expect(settings.body).toEqual([
      { kind: 'circle', centre: [0, 0], diameter: 5 },
      {
        kind: 'polygon',
        points: [
          [0, 0],
          [5, 0],
          [5, 5],
        ],
      },
    ]);
    expect(settings.notes).toEqual({ operator: 'lab 3', 'run-number': '12' });
  });

  it('reads several bodies and notes from options given several times', () => {
    const body = ['circle 0, 0, 5 mm', 'polygon 0 0; 5 0; 5 5 mm and circle 9, 9, 1 mm'];
    const notes = ['operator: A; B', 'facility: tunnel: 2'];
    const { settings } = resolveRun({ options: { scale: '1 mm/px', body, notes } });
    expect(settings.body.map(({ kind }) => kind)).toEqual(['circle', 'polygon', 'circle']);
    expect(settings.notes).toEqual({ operator: 'A; B', facility: 'tunnel: 2' });
    const refused = (given: string[]) => () => resolveRun({ options: { notes: given } });
    expect(refused(['operator: A', 'operator: B'])).toThrow(/--notes: got the note "operator" twice/);
    expect(refused(['no colon'])).toThrow(/--notes: got "no colon", expected notes by name/);
  });

  it('fills in water from its temperature', () => {
    const { settings, assumptions } = resolveRun({ options: { water: '20 degC' } });
    expect(settings.fluid).toMatchObject({ kind: 'water', temperature: { value: 20, unit: 'degC' } });
    expect(assumptions.some((sentence) => sentence.startsWith('Water is taken as pure and fresh'))).toBe(true);
    expect(resolveRun({}).settings.fluid).toBeNull();
  });

  it('turns a direction into a unit vector', () => {
    const options = { scale: '1 mm/px', rate: '1 Hz', 'stream-speed': '3 cm/s', 'stream-direction': '3, 4' };
    const { stream } = resolveRun({ options }).settings;
    expect(stream).toEqual({ speed: { value: 30, unit: 'mm/s', standardUncertainty: null }, direction: [0.6, 0.8, 0] });
  });
});

describe('nearest word', () => {
  it('counts insertions, deletions and changes', () => {
    // Textbook example of Levenshtein's distance: kitten to sitting takes 3.
    expect(editDistance('kitten', 'sitting')).toBe(3);
    expect(editDistance('', 'abc')).toBe(3);
    expect(editDistance('same', 'same')).toBe(0);
  });

  it('names a near word and is silent where none is near', () => {
    expect(nearestWord('Y_Axis', ['y-axis', 'x'])).toBe('y-axis');
    expect(nearestWord('zebra', ['rate', 'scale'])).toBeNull();
  });
});
