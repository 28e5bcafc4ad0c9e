import type { DumpFile, SetAside } from '../detections/dump.js';
import type { Prior } from '../pipeline/stages.js';
import type { SettingRecord } from '../run/settings.js';

/**
 * Version of the result folder's layout, major.minor: readers take their own and older minors of the same major.
 * 1.1: `sample_time` in frames.nc.
 */
export const SCHEMA_VERSION = '1.1';

/** How many of what went in and came out, in the order of the data. Nothing is dropped without standing here. */
export interface RunCounts {
  readonly rowsPresent: number;
  readonly rowsRead: number;
  readonly rowsSetAside: readonly SetAside[];
  /** Frame numbers from first to last, those with detections, those without. */
  readonly framesSpanned: number;
  readonly framesPresent: number;
  readonly detections: number;
  /** Left out by geometry: outside the region, inside a body. */
  readonly outsideRegion: number;
  readonly insideBody: number;
  /** Left out because they lie more than ten fields away from the field (a slip of a digit). */
  readonly farAway: number;
  readonly detectionsForLinking: number;
  /** Links made (pairs of successive detections of one kept pathline), links across missing frames. */
  readonly links: number;
  readonly linksBridging: number;
  readonly linksLeftOutForRisk: number;
  /** Pathlines kept, their samples; fragments shorter than `shortest` and their detections (set aside). */
  readonly pathlines: number;
  readonly samples: number;
  readonly shortFragments: number;
  readonly shortFragmentDetections: number;
  readonly unlinkedDetections: number;
  /** Samples that carry each flag. */
  readonly flagged: Readonly<Record<string, number>>;
  readonly samplesInGrid: number;
  readonly binsFilled: number;
  readonly bins: number;
}

/** Flow figures for people: what they mean is in the key. */
export interface RunFigures {
  readonly meanSpeed: number;
  readonly peakSpeed: number;
  readonly velocityUnit: string;
  readonly lengthUnit: string;
  readonly timeUnit: string;
  readonly displacementRatio: number;
  readonly displacementRatio95: number;
  readonly medianPathlineSamples: number;
  readonly noise: readonly number[];
  readonly medianVelocitySe: number;
}

/** A relative or absolute systematic uncertainty that does not shrink with the number of samples. */
export interface SystematicLine {
  readonly source: string;
  readonly standardUncertainty: number;
  readonly unit: string;
  readonly effect: string;
}

/** run.json. `clockTimes` and `host` stand apart: they are the only parts that differ between equal runs. */
export interface RunRecord {
  readonly schema: string;
  readonly program: { readonly name: 'wakeloom'; readonly version: string };
  readonly run: string;
  readonly settings: readonly SettingRecord[];
  readonly assumptions: readonly string[];
  readonly notes: Readonly<Record<string, string>>;
  readonly inputs: readonly DumpFile[];
  readonly format: string;
  readonly columns: Readonly<Record<string, string>>;
  readonly counts: RunCounts;
  /** What the first look found; noise and reach a component an axis of the run. */
  readonly prior: Omit<Prior, 'noise' | 'reach'> & {
    readonly noise: readonly number[];
    readonly reach: readonly number[];
  };
  readonly figures: RunFigures;
  readonly systematic: readonly SystematicLine[];
  readonly warnings: readonly string[];
  readonly verdict: null;
  /** Content digest of each NetCDF file and of all three together, SHA-256 hex. */
  readonly digest: { readonly content: string; readonly files: Readonly<Record<string, string>> };
  readonly clockTimes: {
    readonly started: string;
    readonly finished: string;
    readonly seconds: Readonly<Record<string, number>>;
  };
  readonly host: {
    readonly name: string;
    readonly platform: string;
    readonly runtime: string;
    readonly threads: number;
  };
}
