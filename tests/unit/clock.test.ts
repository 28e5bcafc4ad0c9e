import type { ClockSettings } from '@wakeloom/tracker';
import { frameTimes } from '@wakeloom/tracker/detections/clock';
import { describe, expect, it } from 'vitest';

const hertz = (value: number) => ({ value, unit: 'Hz', standardUncertainty: null });
const seconds = (value: number) => ({ value, unit: 's', standardUncertainty: null });

function times(clock: ClockSettings, frames: number[], dumpTime?: number[], after?: { frame: number; time: number }) {
  const { time, segment } = frameTimes({
    clock,
    firstFrame: after === undefined ? frames[0]! : 0,
    number: Int32Array.from(frames),
    dumpTime: dumpTime === undefined ? new Float64Array(frames.length).fill(Number.NaN) : Float64Array.from(dumpTime),
    after: after ?? null,
  });
  return { time: [...time], segment: [...segment] };
}

describe('clock', () => {
  it('counts frames where nothing is known of time', () => {
    expect(times({ kind: 'none' }, [7, 8, 11])).toEqual({ time: [7, 8, 11], segment: [0, 0, 0] });
  });

  it('starts a rate at the first frame and keeps missing frames as gaps', () => {
    expect(times({ kind: 'rate', rate: hertz(4) }, [-3, -2, 1])).toEqual({ time: [0, 0.25, 1], segment: [0, 0, 0] });
  });

  it('takes the times of the dump as they are', () => {
    const given = [0.5, 0.50001, 7];
    expect(times({ kind: 'times' }, [1, 2, 900], given).time).toEqual(given);
  });

  it('refuses times that stand still or fall back, naming the frame', () => {
    const wrong = () => times({ kind: 'times' }, [1, 2, 3], [0, 0.1, 0.1]);
    expect(wrong).toThrow(expect.objectContaining({ code: 'dump/time-not-ascending' }));
    expect(wrong).toThrow(/frame 3 after frame 2/);
    const across = () => times({ kind: 'times' }, [4], [0.2], { frame: 3, time: 0.3 });
    expect(across).toThrow(
      expect.objectContaining({
        code: 'dump/time-not-ascending',
        details: { frame: 4, time: 0.2, frameBefore: 3, timeBefore: 0.3 },
      }),
    );
  });

  it('says that a time is missing', () => {
    expect(() => times({ kind: 'times' }, [5])).toThrow(
      expect.objectContaining({ code: 'dump/no-time', details: { frame: 5 } }),
    );
  });

  it('pairs frames by parity from the first frame number, whichever are present', () => {
    const pairs: ClockSettings = { kind: 'pairs', rate: hertz(8), delay: seconds(0.0005) };
    // Frames 11|12, 13|14, 15|16: the first of the second pair and the second of the third are missing.
    expect(times(pairs, [11, 12, 14, 15])).toEqual({
      time: [0, 0.0005, 0.125 + 0.0005, 0.25],
      segment: [0, 0, 1, 2],
    });
  });

  it('cuts bursts by frame number, with the pause between them', () => {
    const bursts: ClockSettings = { kind: 'bursts', rate: hertz(16), frames: 3, every: seconds(10) };
    expect(times(bursts, [100, 101, 102, 103, 105, 107])).toEqual({
      time: [0, 0.0625, 0.125, 10, 10.125, 20.0625],
      segment: [0, 0, 0, 1, 1, 2],
    });
  });

  it('keeps bursts apart even where no pause is given', () => {
    const bursts: ClockSettings = { kind: 'bursts', rate: hertz(2), frames: 2, every: null };
    expect(times(bursts, [0, 1, 2, 3])).toEqual({ time: [0, 0.5, 1, 1.5], segment: [0, 0, 1, 1] });
  });

  it.each<[string, ClockSettings]>([
    ['rate 0', { kind: 'rate', rate: hertz(0) }],
    ['rate NaN', { kind: 'rate', rate: hertz(Number.NaN) }],
    ['delay as long as the time between pairs', { kind: 'pairs', rate: hertz(10), delay: seconds(0.1) }],
    ['no delay', { kind: 'pairs', rate: hertz(10), delay: seconds(0) }],
    ['half a frame', { kind: 'bursts', rate: hertz(10), frames: 2.5, every: null }],
    ['bursts that overlap', { kind: 'bursts', rate: hertz(10), frames: 11, every: seconds(1) }],
  ])('refuses %s', (_, clock) => {
    expect(() => times(clock, [0, 1])).toThrow(expect.objectContaining({ code: 'sheet/clock' }));
  });
});
