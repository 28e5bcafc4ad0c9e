import { FLAG } from '../core/columns.js';
import { medianInPlace } from '../math/median.js';
import type { PathlineRows } from './pathline-rows.js';

/** When a pathline counts as one that never moves. */
export interface StuckRule {
  /** Extent per axis in standard deviations of the position noise. */
  readonly factor: number;
  /** Standard deviation of the position noise per axis, length unit; NaN: unknown, nothing is stuck. */
  readonly noise: readonly [number, number, number];
  /** Fewest samples that can tell; one sample never does. */
  readonly shortest: number;
}

/**
 * Share of the samples of a stuck pathline that must lie within the extent: a wrong link at an end, or a blink, must not
 * hide that the rest never moves.
 */
const LEAST_SHARE = 0.8;

/**
 * Sets the flag `stuck` on all samples of pathlines with at least `shortest` samples of which at least 80 % lie within
 * half of factor times noise of the pathline's median position along every axis. Fitted positions rather than measured
 * ones, because the scatter of measured ones is larger. A slow particle on a short pathline cannot be told from one that
 * is stuck, and is flagged too. Changes `rows.flags`; writes 1 for stuck pathlines into `stuck` at their final number.
 */
export function flagStuck(rows: PathlineRows, rule: StuckRule, stuck: Uint8Array): void {
  const axes = [rows.x, rows.y, rows.z].slice(0, rows.dims);
  const extents = axes.map((_, axis) => rule.factor * rule.noise[axis]);
  for (let k = 0; k + 1 < rows.offsets.length; k++) {
    const first = rows.offsets[k];
    const end = rows.offsets[k + 1];
    if (end - first < Math.max(2, rule.shortest)) continue;
    if (moves(axes, extents, first, end) || !stays(axes, extents, first, end)) continue;
    stuck[rows.firstPathline + k] = 1;
    for (let i = first; i < end; i++) rows.flags[i] |= FLAG.stuck;
  }
}

/** Quick look that spares nearly all pathlines the medians: its quarter points lie farther apart than a stuck one's, all three. */
function moves(axes: readonly Float64Array[], extents: readonly number[], first: number, end: number): boolean {
  const [a, b, c] = [1, 2, 3].map((quarter) => first + Math.floor((quarter * (end - 1 - first)) / 4));
  const apart = (i: number, j: number) => axes.some((axis, index) => Math.abs(axis[i] - axis[j]) > extents[index]);
  return apart(a, b) && apart(b, c) && apart(a, c);
}

function stays(axes: readonly Float64Array[], extents: readonly number[], first: number, end: number): boolean {
  const middle = axes.map((axis) => medianInPlace(axis.slice(first, end), end - first));
  let near = 0;
  for (let i = first; i < end; i++) {
    // NaN noise: nothing is near.
    if (axes.every((axis, index) => Math.abs(axis[i] - middle[index]) <= extents[index] / 2)) near++;
  }
  return near >= LEAST_SHARE * (end - first);
}
