/**
 * Column types: what flows between the stages. Everything that grows with the run is a typed array, one
 * array a quantity. A block covers whole frames; rows of frame k are `offsets[k] .. offsets[k + 1]`.
 * Blocks are given away: who receives one may change it, who sent it no longer touches it.
 */

/** 2 for a light sheet, 3 for a volume. */
export type Dims = 2 | 3;

/** Frames of a block. */
export interface FrameIndex {
  /** Frame numbers as in the dump, ascending. [frames] */
  readonly number: Int32Array;
  /** Time of each frame in s (in frames where no clock is known), ascending within a segment. [frames] */
  readonly time: Float64Array;
  /** Segment of each frame: links never join two segments (image pairs, bursts). All 0 for an ordinary run. [frames] */
  readonly segment: Int32Array;
  /** First row of each frame; the last entry is the number of rows. [frames + 1] */
  readonly offsets: Uint32Array;
}

/**
 * Detections of consecutive frames. Out of a reader: positions in the dump's unit, `time` NaN unless the
 * dump has a time column. After calibration: positions in the length unit of the results, `time` filled.
 * Within a frame rows are in canonical order after calibration (`detections/canonical-order.ts`), so that
 * no later result depends on the order of rows in the dump.
 */
export interface DetectionBlock extends FrameIndex {
  readonly dims: Dims;
  readonly x: Float64Array;
  readonly y: Float64Array;
  /** Empty (length 0) when dims is 2. */
  readonly z: Float64Array;
  /** Empty when the dump has none. Arbitrary unit of the detection software. */
  readonly brightness: Float32Array;
  /** 0-based data row in the dump, counted over all files in reading order (whole numbers up to 2^53). */
  readonly row: Float64Array;
  /** Pathline numbers the dump came with; empty when it has none; -1 for "not linked". */
  readonly given: Int32Array;
}

/** Detections with the pathline each belongs to. */
export interface LinkedBlock extends DetectionBlock {
  /** Provisional pathline number, -1 where the detection was left out. Numbers ascend with first frame. [rows] */
  readonly pathline: Int32Array;
  /** Probability that the link INTO this detection is wrong; 0 at the first of a pathline. [rows] */
  readonly linkRisk: Float32Array;
}

/** Bits of the `flags` column (CF flag_masks). Order is part of the file format: append only. */
export const FLAG = {
  stuck: 1,
  bridged: 2,
  'near-end': 4,
  'off-fit': 8,
  'off-neighbours': 16,
  'doubtful-link': 32,
  'against-flow': 64,
  'at-body': 128,
} as const;

export type FlagName = keyof typeof FLAG;

/** What each flag means, for files, reports and help. */
export const FLAG_MEANING: Record<FlagName, string> = {
  stuck: 'the pathline never moves beyond its position noise',
  bridged: 'a missing frame was crossed within the fit of this sample',
  'near-end': 'the fit is one-sided: fewer samples than half the span on one side',
  'off-fit': 'the measured position lies too far from the fit of its own pathline',
  'off-neighbours': 'the velocity fails the normalised median test against neighbouring samples',
  'doubtful-link': 'the link risk of this sample or of the next is above the set limit',
  'against-flow': 'the whole pathline contradicts the flow around it',
  'at-body': 'the sample lies in the rim of a body',
};

/** Samples with any of these flags take no part in the grid. `bridged` and `near-end` only inform. */
export const EXCLUDED_FROM_GRID =
  FLAG.stuck | FLAG['off-fit'] | FLAG['off-neighbours'] | FLAG['doubtful-link'] | FLAG['against-flow'];

/**
 * Samples in frame order. Units: positions in the length unit of the results, velocity per s, acceleration
 * per s squared (per frame where no clock is known). `_se` are standard errors of random origin only.
 * For image pairs the acceleration columns are NaN here and absent in the files.
 */
export interface SampleBlock extends FrameIndex {
  readonly dims: Dims;
  /** Provisional pathline number. [rows] */
  readonly pathline: Int32Array;
  /** Fitted position. */
  readonly x: Float64Array;
  readonly y: Float64Array;
  readonly z: Float64Array;
  readonly u: Float32Array;
  readonly v: Float32Array;
  readonly w: Float32Array;
  readonly ax: Float32Array;
  readonly ay: Float32Array;
  readonly az: Float32Array;
  /** Standard errors of position, velocity, acceleration; z/w/az ones are empty when dims is 2. */
  readonly xSe: Float32Array;
  readonly ySe: Float32Array;
  readonly zSe: Float32Array;
  readonly uSe: Float32Array;
  readonly vSe: Float32Array;
  readonly wSe: Float32Array;
  readonly axSe: Float32Array;
  readonly aySe: Float32Array;
  readonly azSe: Float32Array;
  /** Position as detected, before the fit. */
  readonly measuredX: Float64Array;
  readonly measuredY: Float64Array;
  readonly measuredZ: Float64Array;
  readonly linkRisk: Float32Array;
  /** `row` of the detection. */
  readonly detection: Float64Array;
  readonly flags: Uint16Array;
}

/** The one form NaN takes in results, so that equal results are equal bytes. */
export const NAN = Number.NaN;

/** Rows of a block. */
export function rowCount(block: FrameIndex): number {
  return block.offsets[block.offsets.length - 1] ?? 0;
}
