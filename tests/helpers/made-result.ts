import { createContext, type RunRecord } from '@wakeloom/tracker';
import type { ResultPlace } from '@wakeloom/tracker/core/result-place';
import type { GridField, GridResult } from '@wakeloom/tracker/eulerian/grid';
import type { PathlineRows } from '@wakeloom/tracker/store/pathline-rows';
import {
  type FinishedSamples,
  openResultWriter,
  type ResultWriterOptions,
} from '@wakeloom/tracker/store/result-writer';
import { type MadeOptions, madeSamples } from './made-samples.js';

/** A small grid whose values are its bin numbers; bin 1 is empty. */
export function madeGrid(dims: 2 | 3): GridResult {
  const count = [4, 3, dims === 3 ? 2 : 1] as const;
  const bins = count[0] * count[1] * count[2];
  const values = (scale: number) => Float32Array.from({ length: bins }, (_, i) => (i === 1 ? Number.NaN : i * scale));
  const field = (unit: string, longName: string, standardError: string | null, scale: number): GridField => ({
    values: values(scale),
    unit,
    longName,
    standardError,
  });
  return {
    shape: { dims, count, first: [0.5, 1, 2], step: [0.5, 0.5, 1], size: [1, 1, 1] },
    samples: Float64Array.from({ length: bins }, (_, i) => (i === 1 ? 0 : 10 + i)),
    pathlines: Float64Array.from({ length: bins }, (_, i) => (i === 1 ? 0 : 1 + i)),
    fields: new Map([
      ['u', field('mm/s', 'mean velocity along x', 'u_se', 1)],
      ['v', field('mm/s', 'mean velocity along y', null, 2)],
      ['u_se', field('mm/s', 'standard error of u', null, 0.125)],
      ['uu', field('mm2/s2', 'kinematic Reynolds stress uu', null, 0.25)],
    ]),
  };
}

/** A record with nothing in it but what its shape asks for. */
export function madeRecord(finished: FinishedSamples): Omit<RunRecord, 'digest'> {
  return {
    schema: '1.1',
    program: { name: 'wakeloom', version: '0.1.0' },
    run: 'made',
    settings: [],
    assumptions: [],
    notes: {},
    inputs: [],
    format: 'text',
    columns: {},
    counts: {
      rowsPresent: finished.samples,
      rowsRead: finished.samples,
      rowsSetAside: [],
      framesSpanned: 1,
      framesPresent: 1,
      detections: finished.samples,
      outsideRegion: 0,
      insideBody: 0,
      farAway: 0,
      detectionsForLinking: finished.samples,
      links: finished.links,
      linksBridging: finished.linksBridging,
      linksLeftOutForRisk: 0,
      pathlines: finished.pathlines,
      samples: finished.samples,
      shortFragments: finished.shortFragments,
      shortFragmentDetections: finished.shortFragmentDetections,
      unlinkedDetections: 0,
      flagged: finished.flagged,
      samplesInGrid: 0,
      binsFilled: 0,
      bins: 0,
    },
    prior: {
      noise: [0, 0, 0],
      noiseMeasured: true,
      frameStep: 1,
      span: 7,
      reach: [1, 1, 1],
      spacing: 1,
      displacementRatio: 0.1,
      displacementRatio95: 0.2,
    },
    figures: {
      meanSpeed: finished.meanSpeed,
      peakSpeed: finished.peakSpeed,
      velocityUnit: 'mm/s',
      lengthUnit: 'mm',
      timeUnit: 's',
      displacementRatio: 0.1,
      displacementRatio95: 0.2,
      medianPathlineSamples: finished.medianPathlineSamples,
      noise: [0, 0],
      medianVelocitySe: finished.medianVelocitySe,
    },
    systematic: [],
    warnings: [],
    verdict: null,
    clockTimes: { started: '2020-01-01T00:00:00Z', finished: '2020-01-01T00:00:01Z', seconds: {} },
    host: { name: 'made', platform: 'none', runtime: 'none', threads: 1 },
  };
}

/** The options every test starts from. */
export const MADE_OPTIONS: Omit<ResultWriterOptions, 'context' | 'dims'> = {
  pairs: false,
  units: { length: 'mm', time: 's' },
  shortest: 3,
  bridge: 2,
  keepPathlines: 'all',
  keepFrames: 'all',
  stuckFactor: 3,
  noise: [1e-5, 1e-5, 1e-5],
  ramLimit: 2 ** 28,
};

/** A whole result folder out of made samples. */
export async function makeResult(
  place: ResultPlace,
  made: MadeOptions,
  options: Partial<ResultWriterOptions> = {},
  onPathlines: (rows: PathlineRows) => void = () => {},
): Promise<{ finished: FinishedSamples; record: RunRecord }> {
  const dims = made.dims ?? 2;
  const writer = openResultWriter(place, { ...MADE_OPTIONS, dims, context: createContext(), ...options });
  for (const block of madeSamples(made)) await writer.add(block);
  const finished = await writer.finish(onPathlines);
  await writer.writeGrid(madeGrid(dims), { bin_overlap: { type: 'f64', values: [0.5] } });
  const record = await writer.complete(madeRecord(finished), () => '<!doctype html><title>made</title>', [
    '{"code":"a/b"}',
  ]);
  return { finished, record };
}
