import { WakeloomError } from '../core/errors.js';
import type { Quantity } from '../core/quantity.js';
import type { ClockSettings } from '../run/settings.js';

/** What `frameTimes` needs to know. All arrays are borrowed. */
export interface FrameTimesInput {
  readonly clock: ClockSettings;
  /** First frame number of the run: pairs, bursts and time zero are counted from it. */
  readonly firstFrame: number;
  /** Frame numbers, ascending. [frames] */
  readonly number: Int32Array;
  /** Times as the dump gives them, s; looked at by the clock `times` only. [frames] */
  readonly dumpTime: Float64Array;
  /** Last frame before these and its time, where these continue earlier ones; null at the start. */
  readonly after: { readonly frame: number; readonly time: number } | null;
}

/** Time of each frame and the segment it belongs to. [frames] each, new. */
export interface FrameTimes {
  readonly time: Float64Array;
  readonly segment: Int32Array;
}

/**
 * Time and segment of each frame. With f the frame number counted from the first frame of the run:
 *
 * - `none`: t = frame number as in the dump (unit: frame), one segment.
 * - `rate`: t = f / rate, one segment; missing frame numbers stay gaps in time.
 * - `times`: t = the dump's own time, as it is, one segment.
 * - `pairs`: pair k = floor(f / 2) is segment k; t = k / rate, its second frame `delay` later.
 * - `bursts`: burst k = floor(f / frames) is segment k; t = k `every` + (f - k frames) / rate. Without `every`
 *   bursts follow one another without a pause, t = f / rate, but stay segments of their own.
 *
 * Throws `dump/time-not-ascending` (with the frame) where a time is not later than the one before,
 * `dump/no-time` where the dump has none, and `sheet/clock` where rate, delay, frames or every make no clock.
 * Each time is one correctly rounded division away from exact, bursts with a pause two more roundings.
 */
export function frameTimes(input: FrameTimesInput): FrameTimes {
  const { clock, firstFrame, number } = input;
  checkClock(clock);
  const frames = number.length;
  const time = new Float64Array(frames);
  const segment = new Int32Array(frames);
  for (let k = 0; k < frames; k++) {
    const f = number[k]! - firstFrame;
    switch (clock.kind) {
      case 'none':
        time[k] = number[k]!;
        break;
      case 'rate':
        time[k] = f / clock.rate.value;
        break;
      case 'times':
        time[k] = input.dumpTime[k]!;
        break;
      case 'pairs': {
        const pair = Math.floor(f / 2);
        segment[k] = pair;
        time[k] = pair / clock.rate.value + (f % 2 === 0 ? 0 : clock.delay.value);
        break;
      }
      case 'bursts': {
        const burst = Math.floor(f / clock.frames);
        segment[k] = burst;
        time[k] =
          clock.every === null
            ? f / clock.rate.value
            : burst * clock.every.value + (f - burst * clock.frames) / clock.rate.value;
        break;
      }
    }
  }
  if (clock.kind === 'times') checkAscending(input, time);
  return { time, segment };
}

function checkAscending(input: FrameTimesInput, time: Float64Array): void {
  let last = input.after;
  for (let k = 0; k < time.length; k++) {
    const frame = input.number[k]!;
    const t = time[k]!;
    if (!Number.isFinite(t)) {
      throw new WakeloomError(
        'dump/no-time',
        `time of a frame: got none, expected a number of seconds (frame ${frame}); name the time column, or give a rate instead`,
        { frame },
      );
    }
    if (last !== null && !(t > last.time)) {
      throw new WakeloomError(
        'dump/time-not-ascending',
        `times of frames: got ${t} s after ${last.time} s, expected a later time (frame ${frame} after frame ${last.frame}); correct the time column or give a rate instead`,
        { frame, time: t, frameBefore: last.frame, timeBefore: last.time },
      );
    }
    last = { frame, time: t };
  }
}

function checkClock(clock: ClockSettings): void {
  if (clock.kind === 'none' || clock.kind === 'times') return;
  positive('clock rate', clock.rate);
  if (clock.kind === 'pairs') {
    positive('delay of image pairs', clock.delay);
    if (!(clock.delay.value < 1 / clock.rate.value)) {
      clockError(
        `delay of image pairs: got ${clock.delay.value} s at ${clock.rate.value} pairs/s, expected less than the ${1 / clock.rate.value} s from pair to pair`,
      );
    }
  }
  if (clock.kind === 'bursts') {
    if (!(Number.isInteger(clock.frames) && clock.frames >= 1)) {
      clockError(`frames of a burst: got ${clock.frames}, expected a whole number of at least 1`);
    }
    if (clock.every !== null) {
      positive('time between burst starts', clock.every);
      const lasts = (clock.frames - 1) / clock.rate.value;
      if (!(clock.every.value > lasts)) {
        clockError(
          `time between burst starts: got ${clock.every.value} s, expected more than the ${lasts} s that ${clock.frames} frames at ${clock.rate.value} Hz take`,
        );
      }
    }
  }
}

function positive(what: string, quantity: Quantity): void {
  if (!(quantity.value > 0 && Number.isFinite(quantity.value))) {
    clockError(`${what}: got ${quantity.value} ${quantity.unit}, expected a positive number`);
  }
}

function clockError(message: string): never {
  throw new WakeloomError('sheet/clock', `${message} (run sheet: clock)`);
}
