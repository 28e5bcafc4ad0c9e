import { readdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { resolveRun } from '@wakeloom/tracker/run/resolve';
import { parseRunSheet } from '@wakeloom/tracker/run/run-sheet';
import { describe, expect, it } from 'vitest';

const FOLDER = join(import.meta.dirname, 'golden-sheets');

function sheets(kind: 'good' | 'bad'): readonly string[] {
  return readdirSync(join(FOLDER, kind)).filter((name) => name.endsWith('.yaml'));
}

function text(kind: 'good' | 'bad', name: string): string {
  return readFileSync(join(FOLDER, kind, name), 'utf8');
}

function resolveText(source: string, name: string) {
  return resolveRun({ sheet: parseRunSheet(source, name) });
}

/** Problems that resolving `source` reports. */
function problemsOf(source: string, name: string): { readonly code: string; readonly problems: readonly string[] } {
  try {
    resolveText(source, name);
  } catch (error) {
    const { code, details, message } = error as { code: string; details: { problems: string[] }; message: string };
    for (const problem of details.problems) expect(message).toContain(problem);
    return { code, problems: details.problems };
  }
  return { code: 'none', problems: [] };
}

describe('bad run sheets', () => {
  it.each(sheets('bad'))('%s says what, where, and what was expected', (name) => {
    const source = text('bad', name);
    const wanted = [...source.matchAll(/^# expect (.*)$/gm)].map((match) => `${name}:${match[1]}`);
    const starts = [...source.matchAll(/^# expect-start (.*)$/gm)].map((match) => `${name}:${match[1]}`);
    expect(wanted.length + starts.length).toBeGreaterThan(0);
    const { code, problems } = problemsOf(source, name);
    expect(code).toBe('sheet/invalid');
    if (starts.length > 0)
      for (const start of starts) expect(problems.some((line) => line.startsWith(start))).toBe(true);
    else expect(problems).toEqual(wanted);
  });

  it('places problems alike with CRLF line ends and a byte-order mark', () => {
    const source = text('bad', 'several-at-once.yaml');
    const plain = problemsOf(source, 'a.yaml').problems;
    expect(problemsOf(`\ufeff${source.replace(/\n/g, '\r\n')}`, 'a.yaml').problems).toEqual(plain);
    expect(plain).toHaveLength(3);
  });
});

describe('good run sheets', () => {
  it.each(sheets('good'))('%s resolves', (name) => {
    const { settings, records } = resolveText(text('good', name), name);
    expect(settings.dump.files.length).toBeGreaterThan(0);
    expect(records.some((record) => record.origin === 'sheet')).toBe(true);
  });

  it('reads the cylinder sheet figure by figure', () => {
    const { settings, records } = resolveText(text('good', 'cylinder.yaml'), 'cylinder.yaml');
    expect(settings).toMatchObject({
      run: 'cylinder, 30 mm/s, repeat 2',
      dump: { files: ['cylinder-30.csv.gz'], columns: { frame: 'frame', brightness: 'intensity', z: 'auto' } },
      clock: { kind: 'rate', rate: { value: 60, unit: 'Hz', standardUncertainty: 0.01 } },
      geometry: {
        kind: 'scale',
        scale: { value: 0.05, unit: 'mm/px', standardUncertainty: 0.0002 },
        origin: [812, 640, 0],
        originUncertainty: null,
        yAxis: 'down',
        pixelOrigin: 'corner',
      },
      stream: { speed: { value: 30, unit: 'mm/s' }, direction: [1, 0, 0] },
      body: [{ kind: 'circle', centre: [0, 0], diameter: 5 }],
      tracers: { diameter: { value: 20e-6, unit: 'm' }, density: { value: 1030, unit: 'kg/m3' } },
      linking: { reach: 'auto', bridge: 2, care: 'thorough', shortest: 5 },
      smoothing: { span: 'auto' },
      grid: { bin: [0.5, 0.5, 0.5] },
      notes: { operator: '', facility: '', 'calibration-certificate': '' },
      units: { length: 'mm', time: 's' },
    });
    expect(records).toContainEqual({
      key: 'clock.rate.standard-uncertainty',
      value: 0.01,
      unit: 'Hz',
      origin: 'sheet',
    });
  });

  it('turns pixels per length over and keeps the unit of the sheet', () => {
    const { settings } = resolveText(text('good', 'pairs-in-um.yaml'), 'pairs-in-um.yaml');
    expect(settings).toMatchObject({
      dump: { files: ['a.csv', 'b.csv'], header: 'no', columns: { frame: 0, x: 1, y: 2, z: null } },
      clock: { kind: 'pairs', delay: { value: 0.0004, unit: 's' }, rate: { value: 15, unit: 'Hz' } },
      geometry: {
        scale: { value: 0.5, unit: 'um/px' },
        origin: [10, 20, 0],
        region: { x: [0, 500], y: [0, 400], z: null },
      },
      body: [
        {
          kind: 'polygon',
          points: [
            [0, 0],
            [50, 0],
            [50, 50],
          ],
        },
      ],
      grid: { bin: [20, 10, 20], overlap: 0.5 },
      units: { length: 'um', time: 's' },
    });
  });

  it('takes control points and a tow velocity in the unit of the points', () => {
    const { settings } = resolveText(text('good', 'control-points.yaml'), 'control-points.yaml');
    expect(settings.geometry).toEqual({
      kind: 'control-points',
      map: 'affine',
      points: [
        [0, 0, 0, 0],
        [1000, 0, 5, 0],
        [0, 1000, 0, 5],
      ],
      frame: { velocity: [3, 0, 0] },
      region: null,
    });
    expect(settings.clock).toEqual({ kind: 'times' });
    expect(settings.units).toEqual({ length: 'cm', time: 's' });
  });

  it('lets an option overrule the sheet and records who said what', () => {
    const sheet = parseRunSheet(text('good', 'cylinder.yaml'), 'cylinder.yaml');
    const { settings, records } = resolveRun({
      sheet,
      options: { rate: '30 Hz', bridge: 1 },
      dumpFiles: ['other.csv'],
    });
    expect(settings.clock).toMatchObject({ rate: { value: 30 } });
    expect(settings.linking.bridge).toBe(1);
    expect(settings.dump.files).toEqual(['other.csv']);
    const origin = (key: string) => records.find((record) => record.key === key)?.origin;
    expect([origin('clock.rate'), origin('geometry.scale'), origin('seed')]).toEqual(['option', 'sheet', 'default']);
  });
});
