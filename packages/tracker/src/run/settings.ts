import type { Quantity } from '../core/quantity.js';

/**
 * Settings of one run as resolved: units converted, defaults filled, `auto` still marked as `auto` where the
 * data decide later. Made by `run/resolve.ts` from a run sheet and options; written to run.json with each
 * setting's origin. Lengths are in `units.length`, times in s, or px and frame where none is known.
 */
export interface RunSettings {
  /** Name of the run for titles and files. */
  readonly run: string;
  readonly dump: DumpSettings;
  readonly clock: ClockSettings;
  readonly geometry: GeometrySettings;
  readonly fluid: FluidSettings | null;
  readonly stream: { readonly speed: Quantity; readonly direction: readonly [number, number, number] } | null;
  readonly body: readonly Body[];
  readonly tracers: { readonly diameter: Quantity; readonly density: Quantity } | null;
  readonly linking: LinkingSettings;
  readonly smoothing: SmoothingSettings;
  readonly screening: ScreeningSettings;
  readonly grid: GridSettings;
  readonly results: ResultSettings;
  readonly notes: Readonly<Record<string, string>>;
  readonly seed: number;
  /** Units that results carry. */
  readonly units: { readonly length: string; readonly time: 's' | 'frame' };
}

/** Column of a dump by header name or by 0-based position; null: not there. */
export type ColumnRef = string | number | null;

export interface DumpSettings {
  /** As the user wrote them: paths or globs. Resolved to sources outside the library. */
  readonly files: readonly string[];
  readonly format: 'auto' | 'text' | 'npy' | 'hdf5' | 'parquet';
  readonly columns: {
    readonly frame: ColumnRef | 'auto';
    readonly x: ColumnRef | 'auto';
    readonly y: ColumnRef | 'auto';
    readonly z: ColumnRef | 'auto';
    readonly brightness: ColumnRef | 'auto';
    readonly pathline: ColumnRef | 'auto';
    readonly time: ColumnRef | 'auto';
  };
  readonly separator: 'auto' | 'comma' | 'semicolon' | 'tab' | 'blank';
  readonly decimal: 'auto' | 'point' | 'comma';
  readonly header: 'auto' | 'yes' | 'no';
  /** `one-file-a-run`, or one file a frame with the frame number from the last number in the name or from the order. */
  readonly layout: 'one-file-a-run' | 'frame-from-name' | 'frame-from-order';
  /** HDF5: path of the group or table that holds the columns. */
  readonly dataset: string | null;
  /** Whether the time column is the clock; without a frame column frames are then numbered by the distinct times. Absent: no. */
  readonly timesAreClock?: boolean;
  /** Share of bad rows above which the run fails. */
  readonly badRowsLimit: number;
  /** What to do with pathline numbers in the dump: keep them, check them against the linker, or link anew. */
  readonly given: 'keep' | 'check' | 'ignore';
}

export type ClockSettings =
  | { readonly kind: 'none' }
  | { readonly kind: 'rate'; readonly rate: Quantity }
  | { readonly kind: 'times' }
  /** Frames 2k and 2k + 1 (counted from the first frame number present, by parity) form a pair. */
  | { readonly kind: 'pairs'; readonly delay: Quantity; readonly rate: Quantity }
  /** `frames` consecutive frame numbers form a burst, `rate` within it; `every`: time between burst starts, s. */
  | { readonly kind: 'bursts'; readonly rate: Quantity; readonly frames: number; readonly every: Quantity | null };

export type GeometrySettings =
  | {
      readonly kind: 'scale';
      /** Length per px along x and y (and z), standard uncertainty relative to a common factor. */
      readonly scale: Quantity;
      /** Length of one dump unit along z where it differs; null: as scale. */
      readonly scaleZ: Quantity | null;
      /** Point that becomes (0, 0, 0), in dump units, x and y counted from the outer corner of the first pixel. */
      readonly origin: readonly [number, number, number];
      /** Standard uncertainty of the origin, dump units. */
      readonly originUncertainty: number | null;
      /** Counter-clockwise turn of the dump's x axis to the result's x axis, deg. */
      readonly rotation: Quantity;
      readonly yAxis: 'up' | 'down';
      /** Where coordinate (0, 0) of the dump lies in the first pixel. */
      readonly pixelOrigin: 'corner' | 'centre';
      readonly frame: FrameMotion;
      readonly region: Region | null;
    }
  | {
      readonly kind: 'control-points';
      readonly map: 'affine' | 'projective' | 'polynomial-2' | 'polynomial-3';
      /** Rows of [dump x, dump y, true x, true y], true ones in units.length. */
      readonly points: readonly (readonly [number, number, number, number])[];
      readonly frame: FrameMotion;
      readonly region: Region | null;
    };

/** Velocity of the camera or model frame (towed), subtracted from nothing, added to velocities: u_lab = u_frame + velocity. */
export interface FrameMotion {
  readonly velocity: readonly [number, number, number] | null;
}

/** Box in result coordinates; detections outside are counted and left out. */
export interface Region {
  readonly x: readonly [number, number] | null;
  readonly y: readonly [number, number] | null;
  readonly z: readonly [number, number] | null;
}

export type Body =
  | { readonly kind: 'circle'; readonly centre: readonly [number, number]; readonly diameter: number }
  | { readonly kind: 'polygon'; readonly points: readonly (readonly [number, number])[] };

export interface FluidSettings {
  readonly kind: 'water' | 'other';
  /** deg C, for water. */
  readonly temperature: Quantity | null;
  /** m2/s */
  readonly kinematicViscosity: number;
  /** kg/m3 */
  readonly density: number;
}

export interface LinkingSettings {
  readonly reach: number | 'auto';
  readonly bridge: number;
  readonly care: 'quick' | 'thorough';
  readonly shortest: number;
  readonly search: 'cells' | 'kd-tree';
  /** Links with a larger risk are left out. */
  readonly riskLimit: number;
  /** Depth noise over in-plane noise, for gates per axis in 3-D. */
  readonly depthNoise: number;
}

export interface SmoothingSettings {
  /** Frames in the window of the local fit (odd), or auto. */
  readonly span: number | 'auto';
  /** Degree of the local polynomial. */
  readonly order: 1 | 2 | 3;
}

export interface ScreeningSettings {
  /** Threshold of the normalised median test (2 in Westerweel & Scarano 2005). */
  readonly medianThreshold: number;
  /** Neighbours the test looks at; with fewer than 4 the sample is not judged. */
  readonly medianNeighbours: number;
  /** A pathline whose positions stay within this many noise standard deviations is stuck. */
  readonly stuckFactor: number;
}

export interface GridSettings {
  /** Bin size per axis (length), or auto. */
  readonly bin: readonly [number, number, number] | 'auto';
  /** Overlap of neighbouring bins as a share of the bin size, 0 to 0.9. */
  readonly overlap: number;
  /** Fewest samples for a mean, for stresses. */
  readonly fewestForMean: number;
  readonly fewestForStress: number;
}

export interface ResultSettings {
  readonly keepPathlines: 'all' | 'thinned' | 'none';
  readonly keepFrames: 'all' | 'thinned' | 'none';
  /** Working memory the run may take, bytes. */
  readonly ramLimit: number;
  /** Worker threads; results do not depend on it. */
  readonly threads: number;
}

/** Where a setting's value came from. */
export type Origin = 'default' | 'sheet' | 'option' | 'survey';

/** One line of the resolved settings as run.json and reports show it. */
export interface SettingRecord {
  /** Dotted path in the run sheet: `linking.reach`. */
  readonly key: string;
  readonly value: string | number | boolean | null | readonly (string | number)[];
  readonly unit: string | null;
  readonly origin: Origin;
}

/** Resolved settings and the origin of each. */
export interface ResolvedRun {
  readonly settings: RunSettings;
  readonly records: readonly SettingRecord[];
  /** Plain sentences about what was assumed (no scale given, y counts as up, ...). */
  readonly assumptions: readonly string[];
}
