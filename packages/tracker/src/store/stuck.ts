import { FLAG } from '../core/columns.js';
import type { PathlineRows } from './pathline-rows.js';

/** When a pathline counts as one that never moves. */
export interface StuckRule {
  /** Largest extent per axis in standard deviations of the position noise. */
  readonly factor: number;
  /** Standard deviation of the position noise per axis, length unit; NaN: unknown, nothing is stuck. */
  readonly noise: readonly [number, number, number];
  /** Fewest samples that can tell; one sample never does. */
  readonly shortest: number;
}

/**
 * Sets the flag `stuck` on all samples of pathlines with at least `shortest` samples whose fitted positions stay
 * within factor times noise along every axis (largest less smallest). Fitted rather than measured, because the range of
 * measured positions grows with their number even for a particle at rest. A slow particle on a short pathline cannot
 * be told from one that is stuck, and is flagged too. Changes `rows.flags`; writes 1 for stuck pathlines into `stuck`
 * at their final number.
 */
export function flagStuck(rows: PathlineRows, rule: StuckRule, stuck: Uint8Array): void {
  const axes = [rows.x, rows.y, rows.z].slice(0, rows.dims);
  for (let k = 0; k + 1 < rows.offsets.length; k++) {
    const first = rows.offsets[k];
    const end = rows.offsets[k + 1];
    if (end - first < Math.max(2, rule.shortest)) continue;
    if (!axes.every((axis, index) => extent(axis, first, end) <= rule.factor * rule.noise[index])) continue;
    stuck[rows.firstPathline + k] = 1;
    for (let i = first; i < end; i++) rows.flags[i] |= FLAG.stuck;
  }
}

function extent(values: Float64Array, first: number, end: number): number {
  let low = values[first];
  let high = low;
  for (let i = first + 1; i < end; i++) {
    if (values[i] < low) low = values[i];
    if (values[i] > high) high = values[i];
  }
  return high - low;
}
