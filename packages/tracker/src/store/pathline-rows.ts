import type { Dims } from '../core/columns.js';

/**
 * Samples of consecutive whole pathlines, flags final, one value a row in every column; units as in SampleBlock.
 * Columns of absent axes (and of acceleration for image pairs) have length 0. Borrowed: the arrays are used
 * again once the receiver's promise has settled.
 */
export interface PathlineRows {
  readonly dims: Dims;
  /** Final number of the first pathline here, and of its first row in pathlines.nc (with all kept). */
  readonly firstPathline: number;
  readonly firstRow: number;
  /** Rows of pathline firstPathline + k are offsets[k] .. offsets[k + 1] - 1 of these columns. [pathlines + 1] */
  readonly offsets: Uint32Array;
  /** Final pathline number. [rows] */
  readonly pathline: Int32Array;
  readonly frame: Int32Array;
  readonly time: Float64Array;
  readonly x: Float64Array;
  readonly y: Float64Array;
  readonly z: Float64Array;
  readonly u: Float32Array;
  readonly v: Float32Array;
  readonly w: Float32Array;
  readonly ax: Float32Array;
  readonly ay: Float32Array;
  readonly az: Float32Array;
  readonly xSe: Float32Array;
  readonly ySe: Float32Array;
  readonly zSe: Float32Array;
  readonly uSe: Float32Array;
  readonly vSe: Float32Array;
  readonly wSe: Float32Array;
  readonly axSe: Float32Array;
  readonly aySe: Float32Array;
  readonly azSe: Float32Array;
  readonly measuredX: Float64Array;
  readonly measuredY: Float64Array;
  readonly measuredZ: Float64Array;
  readonly linkRisk: Float32Array;
  readonly detection: Float64Array;
  readonly flags: Uint16Array;
}
