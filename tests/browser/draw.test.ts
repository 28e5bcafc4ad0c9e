import { describe, expect, it } from 'vitest';
import {
  boundsOf,
  canvasHeight,
  fitFrame,
  MARGIN,
  toCanvasX,
  toCanvasY,
} from '../../packages/web-viewer/src/draw/plot-frame.js';
import { speedScale, speedStep } from '../../packages/web-viewer/src/draw/speed-scale.js';
import { filledOptions } from '../../packages/web-viewer/src/state/setting-fields.js';

describe('plot frame', () => {
  it('puts known points on their pixels, y up, one scale for both axes', () => {
    const frame = fitFrame({ left: 0, right: 64, bottom: -48, top: 0 }, 640 + MARGIN.left + MARGIN.right, 10_000);
    expect(frame.scale).toBe(10);
    expect([toCanvasX(frame, 0), toCanvasX(frame, 32), toCanvasX(frame, 64)].map((x) => x - MARGIN.left)).toEqual([
      0, 320, 640,
    ]);
    expect([toCanvasY(frame, 0), toCanvasY(frame, -48)].map((y) => y - MARGIN.top)).toEqual([0, 480]);
    expect(canvasHeight(frame)).toBe(480 + MARGIN.top + MARGIN.bottom);
  });

  it('keeps tall data within the height, in the middle', () => {
    const frame = fitFrame({ left: 0, right: 1, bottom: 0, top: 10 }, 800, 500);
    expect(frame.height).toBeCloseTo(500 - MARGIN.top - MARGIN.bottom, 9);
    expect(frame.width).toBeCloseTo(frame.height / 10, 9);
    expect(frame.left + frame.width / 2).toBeCloseTo((MARGIN.left + 800 - MARGIN.right) / 2, 9);
  });

  it('has bounds for flat data and none without data', () => {
    expect(boundsOf(new Float32Array(0), new Float32Array(0))).toBeNull();
    const flat = boundsOf(Float32Array.of(0, 10), Float32Array.of(3, 3));
    expect(flat).toMatchObject({ left: 0, right: 10 });
    expect(flat?.top).toBeGreaterThan(3);
    expect(flat?.bottom).toBeLessThan(3);
    const point = boundsOf(Float32Array.of(0), Float32Array.of(0));
    expect(point?.right).toBeGreaterThan(0);
  });
});

describe('speed scale', () => {
  it('ends at a round speed that holds 99.5 % of the samples', () => {
    // 1 .. 1000: entry 995 of the sorted copy is 996; steps of 100 are round there, so that the end is 1000.
    const scale = speedScale(
      Float32Array.from({ length: 1000 }, (_, i) => 1000 - i),
      false,
    );
    expect(scale.high).toBe(1000);
    expect(speedStep(scale, 0)).toBe(0);
    expect(speedStep(scale, 5000)).toBe(scale.colours.length - 1);
    expect(speedStep(scale, 499)).toBe(scale.colours.length / 2 - 1);
    expect(speedStep(scale, 501)).toBe(scale.colours.length / 2);
  });

  it('takes parts of the map that stand out from the page', () => {
    const speed = Float32Array.of(1);
    expect(new Set(speedScale(speed, false).colours).size).toBe(32);
    expect(speedScale(speed, true).colours[0]).not.toBe(speedScale(speed, false).colours[0]);
    expect(speedScale(new Float32Array(0), true).high).toBeGreaterThan(0);
  });
});

describe('settings of the form', () => {
  it('leave out what is empty', () => {
    expect(filledOptions({ rate: ' 500 Hz ', scale: '', bin: '  ' })).toEqual({ rate: '500 Hz' });
  });
});
