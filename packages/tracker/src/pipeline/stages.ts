import type { RunContext } from '../core/context.js';
import type { DumpScan } from '../detections/dump.js';
import type { RunSettings } from '../run/settings.js';

/** What the first look at the data fixes for the whole run (bounded work: the first frames or pairs only). */
export interface Prior {
  /** Position noise (standard deviation) per axis, length unit. */
  readonly noise: readonly [number, number, number];
  /** Whether the noise was measured from trial pathlines or assumed from the spacing. */
  readonly noiseMeasured: boolean;
  /** Step of the frame numbers where the dump counts in steps (every second frame kept: 2), else 1. */
  readonly frameStep: number;
  /** Frames in the window of the local fit, odd. */
  readonly span: number;
  /** Reach for linking, length unit, per axis. */
  readonly reach: readonly [number, number, number];
  /** Mean spacing n^(-1/D) of one frame's particles, length unit. */
  readonly spacing: number;
  /** Mean displacement a frame interval over `spacing`, and its 95th percentile; null where nothing was linked. */
  readonly displacementRatio: number | null;
  readonly displacementRatio95: number | null;
}

/** What every stage is handed. */
export interface StageInput {
  readonly settings: RunSettings;
  readonly scan: DumpScan;
  readonly prior: Prior;
  readonly context: RunContext;
}
