import { keyFigureList, LASER_CAUTION, NO_CERTIFICATION, reportHtml } from '@wakeloom/tracker/figures/report';
import { fluctuationEnergy, fullestPlane, rangeOf, speedOf, zerosEmpty } from '@wakeloom/tracker/figures/report-data';
import { countLines } from '@wakeloom/tracker/figures/report-tables';
import { escapeText } from '@wakeloom/tracker/figures/svg';
import { describe, expect, it } from 'vitest';
import { sampleGrid, sampleRecord, sampleReportData } from '../helpers/sample-run.js';

/** Text a reader sees: tags and styles out, entities back, thin spaces as plain ones. */
function readable(html: string): string {
  return html
    .replace(/<style>[\s\S]*?<\/style>/g, '')
    .replace(/<[^>]+>/g, ' ')
    .replace(/&lt;/g, '<')
    .replace(/&gt;/g, '>')
    .replace(/&quot;/g, '"')
    .replace(/&#39;/g, "'")
    .replace(/&amp;/g, '&')
    .replace(/[\s\u2009]+/g, ' ');
}

describe('reportHtml', () => {
  const html = reportHtml(sampleRecord(), sampleReportData());
  const text = readable(html);

  it('holds run name, key figures with units, counts, settings with origin, warnings, digest', () => {
    for (const part of [
      'cylinder, 30 mm/s, repeat 2',
      'Mean speed 28.31 mm/s',
      'Peak speed 47.90 mm/s',
      'Displacement ratio 0.391',
      '95th percentile 0.553',
      'Position noise 0.0051, 0.0049 mm',
      // From 03:05:00 to 03:05:09, whatever the stages add up to.
      'finished 2026-01-02T03:05:09Z, 9.0 s with 2 threads.',
      'Rows in the dump 1 200 012',
      'rows set aside 5 < 0.01 % of rows',
      'not finite 3 cylinder-30.csv:17 "NaN"',
      'geometry.scale 0.05 mm/px sheet',
      'grid.bin 1, 1 mm option',
      'Frame 214 holds no detections.',
      'The density of water is taken at 20 degC.',
      'scale 0.40 % of every length and velocity',
      'operator: A. N. Other',
      'cd'.repeat(32),
    ]) {
      expect(text).toContain(part);
    }
    expect(text).not.toContain('facility:');
  });

  it('names what nobody set in one line, and marks what is not at its default', () => {
    const record = sampleRecord({
      settings: [
        { key: 'dump.dataset', value: null, unit: null, origin: 'default' },
        { key: 'linking.bridge', value: 2, unit: null, origin: 'default' },
        { key: 'dump.columns.z', value: null, unit: null, origin: 'option' },
      ],
    });
    const page = reportHtml(record, sampleReportData());
    expect(readable(page)).toContain('Not set: dump.dataset.');
    expect(page).toContain('<tr><th scope="row">linking.bridge</th><td>2</td>');
    expect(page).toContain('<tr class="changed"><th scope="row">dump.columns.z</th><td>none</td>');
  });

  it('says what it is not, and warns of lasers', () => {
    expect(text).toContain(NO_CERTIFICATION);
    expect(text).toContain(LASER_CAUTION);
    expect(text).not.toMatch(/verdict/i);
  });

  it('keeps a unit on the line of its figure', () => {
    expect(html).toContain('<dd>0.0051, 0.0049\u00a0<small>mm</small></dd>');
  });

  it('tells of image pairs without pathline lengths, and counts both detections of a sample', () => {
    const record = sampleRecord();
    const paired = {
      ...record,
      settings: [...record.settings, { key: 'clock.pairs.delay', value: 4e-4, unit: 's', origin: 'option' as const }],
      counts: { ...record.counts, samples: 500_000, pathlines: 500_000, detectionsForLinking: 1_250_000 },
      figures: { ...record.figures, medianPathlineSamples: 1 },
    };
    const page = readable(reportHtml(paired, sampleReportData()));
    expect(page).toContain('Pathlines 500 000 one sample each, from the two detections of a pair');
    expect(page).toContain('Samples 500 000 two detections each: 80 % of detections for linking');
    expect(page).not.toMatch(/median 1 |Lengths of pathlines/);
    expect(countLines(paired.counts, true).find(({ name }) => name === 'Samples')?.share).toBe(0.8);
    const single = { ...record, figures: { ...record.figures, medianPathlineSamples: 1 } };
    expect(readable(reportHtml(single, sampleReportData()))).toMatch(/median 1 sample[^s]/);
  });

  it('says which plane of a grid in space is shown', () => {
    const plane = sampleGrid(4, 3);
    const data = sampleReportData();
    const stack = (values: ArrayLike<number>) => Float32Array.from({ length: 36 }, (_, i) => values[i % 12]!);
    const fields = new Map([...plane.fields].map(([name, field]) => [name, { ...field, values: stack(field.values) }]));
    const samples = Float64Array.from({ length: 36 }, (_, i) => (i < 12 || i >= 24 ? 0 : 1));
    const shape = { ...plane.shape, dims: 3 as const, count: [4, 3, 3] as const, first: [0, 0, 8.5] as const };
    const page = readable(
      reportHtml(sampleRecord(), { ...data, grid: { shape, samples, pathlines: samples, fields } }),
    );
    expect(page).toContain('Shown: plane z = 9.500 mm, 2nd of 3.');
  });

  it('has six pictures, each with a title and a description for those who cannot see it', () => {
    const pictures = html.match(/<svg [\s\S]*?<\/svg>/g)!;
    expect(pictures).toHaveLength(6);
    for (const svg of pictures) {
      const [, title, description] = /aria-labelledby="(\S+) (\S+)"/.exec(svg)!;
      expect(svg).toMatch(new RegExp(`<title id="${title}">[^<]+</title>`));
      expect(svg).toMatch(new RegExp(`<desc id="${description}">[^<]{20,}</desc>`));
    }
    const ids = [...html.matchAll(/ id="([^"]+)"/g)].map(([, id]) => id);
    expect(new Set(ids).size).toBe(ids.length);
  });

  it('loads nothing from anywhere and runs no script', () => {
    expect(html).not.toMatch(/<script|<link|<iframe|@import|url\(\s*['"]?(?!#)/i);
    const addresses = [...html.matchAll(/\b(?:href|src)="([^"]*)"/g)].map(([, address]) => address!);
    expect(addresses.length).toBeGreaterThan(0);
    for (const address of addresses) expect(address).toMatch(/^(data:image\/png;base64,|#)/);
  });

  it('escapes whatever came from files', () => {
    const evil = '"><img src=x onerror=alert(1)>';
    const record = sampleRecord({
      run: evil,
      warnings: [evil],
      assumptions: [evil],
      notes: { [evil]: evil },
      inputs: [{ name: evil, bytes: 1, modified: evil, sha256: evil }],
      settings: [{ key: evil, value: evil, unit: evil, origin: 'sheet' }],
      systematic: [{ source: evil, standardUncertainty: 1, unit: evil, effect: evil }],
    });
    const page = reportHtml(record, sampleReportData());
    expect(page).not.toContain('<img');
    expect(page.split(escapeText(evil)).length - 1).toBeGreaterThanOrEqual(10);
  });

  it('leaves out maps of what the grid does not hold, and stands an empty run', () => {
    const data = sampleReportData();
    const record = sampleRecord();
    const page = reportHtml(
      { ...record, counts: { ...record.counts, rowsSetAside: [] } },
      {
        grid: { ...data.grid, fields: new Map() },
        bodies: [],
        detectionsPerFrame: { frame: [], detections: [] },
        pathlinesBySamples: [],
      },
    );
    expect(page.match(/<svg /g)).toHaveLength(3);
    expect(readable(page)).toContain('No row was set aside.');
    expect(readable(page)).not.toMatch(/NaN|undefined|Infinity/);
  });
});

describe('what the report computes', () => {
  it('speed is the length of the mean velocity, empty where it is', () => {
    const grid = sampleGrid();
    const speed = speedOf(grid);
    const [u, v] = ['u', 'v'].map((name) => grid.fields.get(name)!.values);
    expect(speed[0]).toBe(Math.sqrt(u![0]! * u![0]! + v![0]! * v![0]!));
    expect(speed.filter(Number.isNaN)).toHaveLength(u!.filter(Number.isNaN).length);
  });

  it('energy of the fluctuations is half the sum of the normal stresses, and says in how many bins', () => {
    const grid = sampleGrid(64, 51);
    const plane = fluctuationEnergy(grid)!;
    const [uu, vv] = ['uu', 'vv'].map((name) => grid.fields.get(name)!.values);
    expect(plane.formula).toBe('(uu + vv) / 2');
    const at = 40 * 64 + 30;
    expect(plane.values[at]).toBe((uu![at]! + vv![at]!) / 2);
    expect(plane.values[0]).toBeNaN();
    const ww = { ...grid.fields.get('uu')!, values: new Float32Array(uu!.length).fill(6) };
    const solid = fluctuationEnergy({ ...grid, fields: new Map([...grid.fields, ['ww', ww]]) })!;
    expect(solid.formula).toBe('(uu + vv + ww) / 2');
    expect(solid.values[at]).toBeCloseTo(plane.values[at]! + 3, 12);
    expect(fluctuationEnergy({ ...grid, fields: new Map() })).toBeNull();
    const finite = plane.values.filter(Number.isFinite).length;
    expect(finite).toBeGreaterThan(3000);
    const text = readable(reportHtml(sampleRecord(), sampleReportData()));
    expect(text).toContain(`Reynolds stresses in ${finite} of ${plane.values.length} bins`);
  });

  it('the fullest plane has the most bins with samples', () => {
    const grid = sampleGrid(2, 1);
    const shape = { ...grid.shape, dims: 3 as const, count: [2, 1, 3] as const };
    expect(fullestPlane({ ...grid, shape, samples: Float64Array.of(9, 0, 1, 1, 0, 5) })).toBe(1);
  });

  it('ranges leave out what is not finite, zeros of counts are empty', () => {
    expect(rangeOf([3, Number.NaN, 1, Number.POSITIVE_INFINITY])).toEqual({ least: 1, mean: 2, most: 3, finite: 2 });
    expect([...zerosEmpty([0, 2])]).toEqual([Number.NaN, 2]);
  });

  it('every count of the record stands in the table of steps', () => {
    const { counts } = sampleRecord();
    const shown = new Set(countLines(counts).map(({ count }) => count));
    const { rowsSetAside, flagged, ...plain } = counts;
    // Shown through another line: rows read are the detections, spanned frames and bins are what shares are of, and
    // fragments are shown by their detections.
    const elsewhere = new Set(['rowsRead', 'framesSpanned', 'bins', 'shortFragments']);
    for (const [name, value] of Object.entries(plain))
      if (!elsewhere.has(name)) expect([name, shown.has(value)]).toEqual([name, true]);
    expect(shown.has(rowsSetAside.reduce((sum, { count }) => sum + count, 0))).toBe(true);
    for (const value of Object.values(flagged)) expect(shown.has(value)).toBe(true);
  });

  it('every key figure that is a quantity has a unit', () => {
    const units = Object.fromEntries(keyFigureList(sampleRecord()).map(({ name, unit }) => [name, unit]));
    expect(units).toMatchObject({ 'Mean speed': 'mm/s', 'Peak speed': 'mm/s', 'Position noise': 'mm' });
  });
});
