import type { ClockSettings } from '../run/settings.js';
import type { DumpScan } from './dump.js';

/** Relative difference of rate and time column above which a person is told: ten times a poor crystal's error. */
const RATE_TOLERANCE = 1e-3;

/**
 * Time from frame number to frame number: the median of the slopes between frames half a recording apart, so that
 * neither times rounded to a few digits nor a corrupt one move it. NaN with fewer than two frames. Cost: a sort of half
 * the frames.
 */
export function timeStep(number: Int32Array, time: Float64Array): number {
  const half = number.length >> 1;
  if (half === 0 || time.length < number.length) return Number.NaN;
  const slopes = new Float64Array(number.length - half);
  for (let k = 0; k < slopes.length; k++) slopes[k] = (time[k + half] - time[k]) / (number[k + half] - number[k]);
  slopes.sort();
  return slopes[slopes.length >> 1];
}

/** What to tell of a time column that is not the clock; null each where there is nothing to tell. */
export interface TimeColumnWords {
  readonly note: string | null;
  readonly warning: string | null;
}

/**
 * Tells that a dump carries times which the run does not use, and warns where they contradict the frame rate by more
 * than 0.1 %. `frameStep` is the step of frame numbers that one frame at that rate stands for.
 */
export function timeColumnWords(scan: DumpScan, clock: ClockSettings, frameStep: number): TimeColumnWords {
  if (!scan.has.time || clock.kind === 'times') return { note: null, warning: null };
  const column = /"(.*)"/.exec(scan.columns['time'] ?? '')?.[1];
  const name = column === undefined ? 'time column' : `column "${column}"`;
  const instead = clock.kind === 'none' ? 'add --times yes' : 'add --times yes and leave out the rate';
  const note = `${name} found, not used as the clock; ${instead} (run sheet: clock: { times: yes }) to use it`;
  if (clock.kind !== 'rate') return { note, warning: null };
  const found = scan.timeStep * frameStep;
  const expected = 1 / clock.rate.value;
  if (!(Math.abs(found / expected - 1) > RATE_TOLERANCE)) return { note, warning: null };
  const [step, stated] = [found, expected].map((value) => Number(value.toPrecision(6)));
  const percent = Number((100 * (found / expected - 1)).toPrecision(3));
  return {
    note,
    warning: `rate and time column disagree: got ${step} s a frame in ${name}, expected ${stated} s at ${clock.rate.value} Hz (${percent > 0 ? '+' : ''}${percent} %); velocities are wrong by as much if the rate is`,
  };
}
