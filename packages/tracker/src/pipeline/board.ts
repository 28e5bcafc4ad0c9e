import type { ByteSource, HasherFactory } from '../core/bytes.js';
import type { DetectionBlock, LinkedBlock, SampleBlock } from '../core/columns.js';
import type { RunContext, RunEvent } from '../core/context.js';
import type { Hdf5Opener } from '../core/hdf5.js';
import type { ResultPlace } from '../core/result-place.js';
import type { CalibrationTally } from '../detections/calibrate.js';
import type { Dump, DumpScan } from '../detections/dump.js';
import type { FarAwayTally, FieldLimits } from '../detections/far-away.js';
import type { GridResult } from '../eulerian/grid.js';
import type { StartRemoteFit } from '../kinematics/fit-stage.js';
import type { GivenTally } from '../linking/given-pathlines.js';
import type { LinkTally } from '../linking/linker.js';
import type { ResolvedRun } from '../run/settings.js';
import type { FinishedSamples } from '../store/result-writer.js';
import type { RunRecord } from '../store/run-record.js';
import type { FirstLook } from './first-look.js';

/** What a run is started with; plain values, so that it can be sent to a worker. */
export interface RunRequest {
  readonly resolved: ResolvedRun;
  readonly programVersion: string;
}

/** What the surroundings hand in: Node and the browser differ here and nowhere else. */
export interface RunTools {
  /** The dump's files, in reading order. */
  readonly sources: readonly ByteSource[];
  readonly hdf5: Hdf5Opener | null;
  readonly hasher: HasherFactory;
  readonly place: ResultPlace;
  /** Starts the fit in another thread; absent: in this one. */
  readonly fit?: StartRemoteFit;
  readonly host: { readonly name: string; readonly platform: string; readonly runtime: string };
  /** Wall clock for provenance only: ISO 8601, and monotonic seconds. */
  readonly clock: { now(): string; seconds(): number };
}

/** Counts of how linking went. */
export interface LinkCounts extends LinkTally {
  /** Null when the dump has no pathline numbers or they are ignored. */
  given: (GivenTally & { agreed: number | null }) | null;
}

/** An event and when it came, s after the start of the run. */
export interface TimedEvent extends RunEvent {
  readonly seconds: number;
}

/** Smallest and largest coordinates. */
export interface Extremes {
  readonly min: [number, number, number];
  readonly max: [number, number, number];
}

/** Number of samples and where they lie, noted while they stream by: those without a flag that excludes them, and all. */
export interface SampleExtent {
  readonly trusted: Extremes;
  readonly all: Extremes;
  samples: number;
}

/**
 * What stages read from and write to. A stage may use what an earlier one gave and nothing else; `runStages`
 * checks `needs` before it runs one.
 */
export interface Board {
  readonly request: RunRequest;
  readonly tools: RunTools;
  readonly context: RunContext;
  /** Start of the run: ISO 8601, and on the clock's monotonic seconds. */
  readonly started: { readonly at: string; readonly seconds: number };
  /** Everything that was told, in order: log.ndjson. */
  readonly events: TimedEvent[];
  /** Durations for run.json, s: scan, look, stream, write, total. */
  readonly seconds: Record<string, number>;
  dump?: Dump;
  scan?: DumpScan;
  look?: FirstLook;
  /** Limits of the field; what lies beyond is no particle. */
  limits?: FieldLimits;
  farAway?: FarAwayTally;
  /** Streams: each may be consumed once. */
  detections?: AsyncIterable<DetectionBlock>;
  calibration?: CalibrationTally;
  linked?: AsyncIterable<LinkedBlock>;
  linkCounts?: LinkCounts;
  /** Provisional numbers of pathlines at stuck places, noted while they are linked. */
  stuckPathlines?: ReadonlySet<number>;
  samples?: AsyncIterable<SampleBlock>;
  extent?: SampleExtent;
  finished?: FinishedSamples;
  grid?: GridResult;
  /** Samples that count in at least one bin. */
  samplesInGrid?: number;
  pathlinesBySamples?: Float64Array;
  record?: RunRecord;
}

/** One stage: what it needs from the board, what it puts there. */
export interface Stage {
  readonly name: string;
  readonly needs: readonly (keyof Board)[];
  readonly gives: readonly (keyof Board)[];
  /**
   * True where the work is done when `run` is: its duration is then noted under the stage's name. A stage that opens
   * a stream has done nothing yet; its work is drawn by the store stage, whose parts are timed there.
   */
  readonly timed: boolean;
  run(board: Board): Promise<void> | void;
}
