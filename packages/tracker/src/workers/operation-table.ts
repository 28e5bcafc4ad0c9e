import type { FitParameters } from '../kinematics/fit-parameters.js';
import type { RunRequest } from '../pipeline/board.js';
import type { ResolvedRun } from '../run/settings.js';
import type { RunRecord } from '../store/run-record.js';
import type { Crate } from './crate.js';

/** One file of a dump as it is named to a worker: a path in Node, a Blob or File in browsers. */
export type SourceRef =
  | { readonly kind: 'path'; readonly path: string }
  | { readonly kind: 'blob'; readonly blob: Blob; readonly name: string };

/** Work that the coordinating worker gives to the others. Buffers are meant to be moved. */
export type KernelOperations = {
  /**
   * The next frames of a fit that goes on in the worker (a `LinkedBlock`) and the samples finished by then
   * (`SampleBlock`s). Without frames: there are no more, and some of the samples left; to be called until none come. A fit
   * is begun by the first call that names it.
   * `spares`: buffers of samples that came, to be filled anew, and back with the answer those of frames.
   */
  'fit-frames': {
    readonly args: {
      readonly fit: string;
      readonly parameters: FitParameters;
      readonly frames: Crate | null;
      readonly spares: readonly ArrayBuffer[];
    };
    readonly value: { readonly samples: readonly Crate[]; readonly spares: readonly ArrayBuffer[] };
  };
};

/** What every tracker worker answers. */
export type RunOperations = KernelOperations & {
  /**
   * Works a whole run into the result folder `out` and gives its record; `limits.threads` workers in all take part,
   * this one included. Files are read in the order given. Codes as `processRun`.
   */
  process: {
    readonly args: { readonly request: RunRequest; readonly sources: readonly SourceRef[]; readonly out: string };
    readonly value: RunRecord;
  };
};

/** Pathlines for drawing: every `stride`-th, so that they fit. Positions and speeds in the run's units. */
export interface PathlinePreview {
  /** Samples of each pathline shown. */
  readonly rowSize: Int32Array<ArrayBuffer>;
  /** [samples shown] */
  readonly x: Float32Array<ArrayBuffer>;
  readonly y: Float32Array<ArrayBuffer>;
  /** Speed, length unit per time unit. [samples shown] */
  readonly speed: Float32Array<ArrayBuffer>;
  readonly stride: number;
  /** Pathlines and samples in the result. */
  readonly pathlines: number;
  readonly samples: number;
}

/**
 * What a worker of a page answers besides: its result folder lies in the worker's memory, one at a time, and a run
 * that needs more than it may hold ends with `store/memory-full` or `store/scratch-full`.
 */
export type PageOperations = RunOperations & {
  /** Settings from options by their names on the command line and a run sheet's text, or none. Codes `usage/settings`, `sheet/invalid`. */
  resolve: {
    readonly args: {
      readonly options: Readonly<Record<string, string>>;
      readonly dumpFiles: readonly string[];
      readonly sheet?: { readonly name: string; readonly text: string } | null;
    };
    readonly value: ResolvedRun;
  };
  /** Pathlines of the last run, at most about `most` samples. Code `store/not-a-result` when there is none. */
  preview: { readonly args: { readonly most: number }; readonly value: PathlinePreview };
  /** Names and bytes of the files of the last run. */
  files: { readonly args: null; readonly value: readonly { readonly name: string; readonly bytes: number }[] };
  /** A copy of one of them. Code `store/not-a-result`. */
  file: { readonly args: { readonly name: string }; readonly value: Uint8Array<ArrayBuffer> };
};
