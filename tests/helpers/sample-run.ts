import type { GridField, GridResult, RunRecord } from '@wakeloom/tracker';
import type { ReportData } from '@wakeloom/tracker/figures/report-data';

/** An invented run record, for tests of texts that are made from one. Not from any real measurement. */
export function sampleRecord(overrides: Partial<RunRecord> = {}): RunRecord {
  return {
    schema: '1.1',
    program: { name: 'wakeloom', version: '0.1.0' },
    run: 'cylinder, 30 mm/s, repeat 2',
    settings: [
      { key: 'clock.rate', value: 60, unit: 'Hz', origin: 'sheet' },
      { key: 'geometry.scale', value: 0.05, unit: 'mm/px', origin: 'sheet' },
      { key: 'linking.reach', value: 'auto', unit: null, origin: 'default' },
      { key: 'linking.shortest', value: 5, unit: null, origin: 'default' },
      { key: 'grid.bin', value: [1, 1], unit: 'mm', origin: 'option' },
    ],
    assumptions: ['The density of water is taken at 20 degC.'],
    notes: { operator: 'A. N. Other', facility: '' },
    inputs: [
      { name: 'cylinder-30.csv.gz', bytes: 12_345_678, modified: '2026-01-02T03:04:05Z', sha256: 'ab'.repeat(32) },
    ],
    format: 'text',
    columns: { frame: 'column 1 "frame"' },
    counts: {
      rowsPresent: 1_200_012,
      rowsRead: 1_200_007,
      rowsSetAside: [
        { reason: 'not-finite', count: 3, examples: [{ file: 'cylinder-30.csv', line: 17, found: 'NaN' }] },
        { reason: 'wrong-field-count', count: 2, examples: [{ file: 'cylinder-30.csv', line: 99, found: '1;2' }] },
      ],
      framesSpanned: 600,
      framesPresent: 599,
      detections: 1_200_007,
      outsideRegion: 7,
      insideBody: 1000,
      farAway: 0,
      detectionsForLinking: 1_199_000,
      links: 1_050_000,
      linksBridging: 50_000,
      linksLeftOutForRisk: 120,
      pathlines: 21_500,
      samples: 1_071_500,
      shortFragments: 20_000,
      shortFragmentDetections: 37_500,
      unlinkedDetections: 90_000,
      flagged: { bridged: 100_000, 'off-fit': 900 },
      samplesInGrid: 1_070_000,
      binsFilled: 3140,
      bins: 3264,
    },
    prior: {
      noise: [0.005, 0.005, Number.NaN],
      noiseMeasured: true,
      frameStep: 1,
      span: 7,
      reach: [0.4, 0.4, 0.4],
      spacing: 1.28,
      displacementRatio: 0.39,
      displacementRatio95: 0.55,
    },
    figures: {
      meanSpeed: 28.31,
      peakSpeed: 47.9,
      velocityUnit: 'mm/s',
      lengthUnit: 'mm',
      timeUnit: 's',
      displacementRatio: 0.391,
      displacementRatio95: 0.553,
      medianPathlineSamples: 38,
      noise: [0.0051, 0.0049],
      medianVelocitySe: 0.057,
    },
    systematic: [{ source: 'scale', standardUncertainty: 0.4, unit: '%', effect: 'of every length and velocity' }],
    warnings: ['Frame 214 holds no detections.'],
    verdict: null,
    digest: { content: 'cd'.repeat(32), files: {} },
    clockTimes: {
      started: '2026-01-02T03:05:00Z',
      finished: '2026-01-02T03:05:09Z',
      seconds: { link: 5.5, write: 3.2 },
    },
    host: { name: 'lab-3', platform: 'linux x64', runtime: 'Node 20.20.0', threads: 2 },
    ...overrides,
  };
}

/** A grid of invented values: flow past a cylinder at the origin (diameter 5) with a made-up wake, a hole in one corner. */
export function sampleGrid(nx = 64, ny = 51, step = 1): GridResult {
  const first: [number, number, number] = [-12, (-(ny - 1) * step) / 2, 0];
  const u = new Float32Array(nx * ny);
  const v = new Float32Array(nx * ny);
  const uu = new Float32Array(nx * ny).fill(Number.NaN);
  const vv = uu.slice();
  const samples = new Float64Array(nx * ny);
  for (let j = 0; j < ny; j++) {
    for (let i = 0; i < nx; i++) {
      const at = j * nx + i;
      const x = first[0] + i * step;
      const y = first[1] + j * step;
      const r2 = x * x + y * y;
      if (r2 < 6.25 || (i > nx - 7 && j < 6)) {
        u[at] = Number.NaN;
        v[at] = Number.NaN;
        continue;
      }
      const wake = x > 0 ? 26 * Math.exp(-((y / (2.5 + 0.05 * x)) ** 2)) * Math.exp(-x / 30) * Math.min(1, x / 3) : 0;
      u[at] = 30 * (1 - (6.25 * (x * x - y * y)) / (r2 * r2)) - wake;
      v[at] = (-30 * 12.5 * x * y) / (r2 * r2);
      // Stresses need more samples than means: none in the first column.
      if (i > 0) {
        uu[at] = 2 + wake;
        vv[at] = 1 + 2 * wake;
      }
      samples[at] = Math.round(320 + 40 * Math.sin(i * 0.9) * Math.cos(j * 0.7));
    }
  }
  const field = (values: Float32Array, longName: string, unit = 'mm/s'): GridField => ({
    values,
    unit,
    longName,
    standardError: null,
  });
  return {
    shape: { dims: 2, count: [nx, ny, 1], first, step: [step, step, 1], size: [step, step, 1] },
    samples,
    pathlines: samples,
    fields: new Map([
      ['u', field(u, 'mean velocity along x')],
      ['v', field(v, 'mean velocity along y')],
      ['uu', field(uu, 'Reynolds stress uu', 'mm2/s2')],
      ['vv', field(vv, 'Reynolds stress vv', 'mm2/s2')],
    ]),
  };
}

/** What a report draws, to go with `sampleRecord`. */
export function sampleReportData(): ReportData {
  const frame = Int32Array.from({ length: 600 }, (_, i) => i);
  return {
    grid: sampleGrid(),
    bodies: [{ kind: 'circle', centre: [0, 0], diameter: 5 }],
    detectionsPerFrame: { frame, detections: Float64Array.from(frame, (i) => 2000 + ((i * 7919) % 83) - 41) },
    pathlinesBySamples: Float64Array.from({ length: 131 }, (_, k) => (k < 5 ? 0 : Math.round(900 * Math.exp(-k / 40)))),
  };
}
