import type { GridResult } from '../eulerian/grid.js';
import type { Body } from '../run/settings.js';

/** What a report draws besides run.json. Borrowed. */
export interface ReportData {
  readonly grid: GridResult;
  /** Bodies in result coordinates. */
  readonly bodies: readonly Body[];
  /** Frame numbers present and detections in each (before geometry leaves any out). Same length. */
  readonly detectionsPerFrame: { readonly frame: ArrayLike<number>; readonly detections: ArrayLike<number> };
  /** Entry k: kept pathlines that have k samples (entry 0 unused). Length: longest pathline + 1. */
  readonly pathlinesBySamples: ArrayLike<number>;
}

/** Index of the plane along z with the most filled bins: what a picture of a 3-D grid shows. 0 in the plane. */
export function fullestPlane(grid: GridResult): number {
  const [nx, ny, nz] = grid.shape.count;
  let best = 0;
  let most = -1;
  for (let k = 0; k < nz; k++) {
    let filled = 0;
    for (let at = k * nx * ny; at < (k + 1) * nx * ny; at++) if (grid.samples[at]! > 0) filled++;
    if (filled > most) {
      most = filled;
      best = k;
    }
  }
  return best;
}

/** Speed of the mean velocity per bin, NaN where u or v (or w) is. New array; zero-length when the grid has no velocity. */
export function speedOf(grid: GridResult): Float64Array {
  const [u, v, w] = ['u', 'v', 'w'].map((name) => grid.fields.get(name)?.values);
  if (u === undefined || v === undefined) return new Float64Array(0);
  return Float64Array.from(u, (ui, i) => Math.sqrt(ui * ui + v[i]! * v[i]! + (w === undefined ? 0 : w[i]! * w[i]!)));
}

/** Kinetic energy of the fluctuations per bin, and its names. */
export interface FluctuationEnergy {
  /** NaN in bins without stresses. [bins], new */
  readonly values: Float64Array;
  readonly unit: string;
  readonly name: string;
  readonly formula: string;
}

/**
 * Half the sum of the normal Reynolds stresses per unit mass: in the plane (uu + vv) / 2, of which nothing is known
 * about the third component, else (uu + vv + ww) / 2. Noise is subtracted already, so that a quiet bin may lie slightly
 * below zero. Null when the grid has no stresses.
 */
export function fluctuationEnergy(grid: GridResult): FluctuationEnergy | null {
  const [uu, vv, ww] = ['uu', 'vv', 'ww'].map((name) => grid.fields.get(name));
  if (uu === undefined || vv === undefined) return null;
  const values = Float64Array.from(
    uu.values,
    (a, i) => (a + vv.values[i]! + (ww === undefined ? 0 : ww.values[i]!)) / 2,
  );
  return ww === undefined
    ? { values, unit: uu.unit, name: 'In-plane kinetic energy', formula: '(uu + vv) / 2' }
    : { values, unit: uu.unit, name: 'Turbulent kinetic energy', formula: '(uu + vv + ww) / 2' };
}

/** Zeros as NaN, so that a map of counts shows bins without samples as empty. New array. */
export function zerosEmpty(counts: ArrayLike<number>): Float64Array {
  return Float64Array.from({ length: counts.length }, (_, i) => (counts[i]! > 0 ? counts[i]! : Number.NaN));
}

/** Smallest, mean and largest finite value, and how many are finite. */
export function rangeOf(values: ArrayLike<number>): { least: number; mean: number; most: number; finite: number } {
  let [least, most, sum, finite] = [Number.POSITIVE_INFINITY, Number.NEGATIVE_INFINITY, 0, 0];
  for (let i = 0; i < values.length; i++) {
    const value = values[i]!;
    if (!Number.isFinite(value)) continue;
    least = Math.min(least, value);
    most = Math.max(most, value);
    sum += value;
    finite++;
  }
  return finite === 0
    ? { least: Number.NaN, mean: Number.NaN, most: Number.NaN, finite }
    : { least, mean: sum / finite, most, finite };
}
