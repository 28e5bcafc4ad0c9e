import type { Dims } from '../core/columns.js';

/** Regular grid of bins, possibly overlapping. Bin i along an axis covers centre(i) -+ size / 2. */
export interface GridShape {
  readonly dims: Dims;
  /** Number of bins along x, y, z (z: 1 in the plane). */
  readonly count: readonly [number, number, number];
  /** Centre of bin (0, 0, 0), length unit. */
  readonly first: readonly [number, number, number];
  /** Distance of neighbouring centres: size times (1 - overlap). */
  readonly step: readonly [number, number, number];
  /** Edge length of a bin. */
  readonly size: readonly [number, number, number];
}

/** Index of bin (i, j, k) in the arrays below: x runs fastest. */
export function binIndex(shape: GridShape, i: number, j: number, k: number): number {
  return (k * shape.count[1] + j) * shape.count[0] + i;
}

/**
 * Statistics per bin, arrays of count[0] * count[1] * count[2], x fastest; NaN where too thin for a figure.
 * Keys are variable names of grid.nc: u, v, (w), u_se, v_se, (w_se), uu, uv, vv, (uw, vw, ww), their _se,
 * and the same stresses with `_raw` before the noise variance of the velocity is subtracted.
 */
export interface GridResult {
  readonly shape: GridShape;
  readonly samples: Float64Array;
  readonly pathlines: Float64Array;
  readonly fields: ReadonlyMap<string, GridField>;
}

/** One variable of grid.nc. */
export interface GridField {
  readonly values: Float32Array;
  /** In terms of the run's length unit and time unit, such as `mm/s` or `mm2/s2`. */
  readonly unit: string;
  readonly longName: string;
  /** Name of the variable with its standard error, if there is one. */
  readonly standardError: string | null;
}
