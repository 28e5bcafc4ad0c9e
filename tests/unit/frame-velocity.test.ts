import type { SampleBlock } from '@wakeloom/tracker';
import { addFrameVelocity } from '@wakeloom/tracker/detections/frame-velocity';
import { describe, expect, it } from 'vitest';

function samples(dims: 2 | 3): SampleBlock {
  const none = new Float32Array(0);
  const wide = new Float64Array(0);
  const third = (values: Float32Array) => (dims === 3 ? values : none);
  return {
    dims,
    number: Int32Array.of(0),
    time: Float64Array.of(0),
    segment: Int32Array.of(0),
    offsets: Uint32Array.of(0, 2),
    pathline: Int32Array.of(0, 1),
    x: Float64Array.of(1, 2),
    y: Float64Array.of(3, 4),
    z: dims === 3 ? Float64Array.of(5, 6) : wide,
    u: Float32Array.of(1, -2),
    v: Float32Array.of(0.5, Number.NaN),
    w: third(Float32Array.of(8, 9)),
    ax: Float32Array.of(1, 2),
    ay: Float32Array.of(3, 4),
    az: third(Float32Array.of(5, 6)),
    xSe: none,
    ySe: none,
    zSe: none,
    uSe: none,
    vSe: none,
    wSe: none,
    axSe: none,
    aySe: none,
    azSe: none,
    measuredX: wide,
    measuredY: wide,
    measuredZ: wide,
    linkRisk: none,
    detection: wide,
    flags: new Uint16Array(0),
  };
}

describe('velocity of a towed frame', () => {
  it('is added to velocities only', () => {
    const block = samples(3);
    addFrameVelocity(block, [-300, 0.25, 2]);
    expect([...block.u]).toEqual([-299, -302]);
    expect([...block.v]).toEqual([0.75, Number.NaN]);
    expect([...block.w]).toEqual([10, 11]);
    const untouched = samples(3);
    for (const name of ['x', 'y', 'z', 'ax', 'ay', 'az'] as const) expect(block[name]).toEqual(untouched[name]);
  });

  it('brings water at rest, seen from a carriage, to rest', () => {
    // A carriage that runs at +300 along x sees still water pass at -300.
    const block = { ...samples(2), u: Float32Array.of(-300, -300) };
    addFrameVelocity(block, [300, 0, 0]);
    expect([...block.u]).toEqual([0, 0]);
    expect(block.w.length).toBe(0);
  });

  it('refuses a velocity that is no number', () => {
    expect(() => addFrameVelocity(samples(2), [Number.NaN, 0, 0])).toThrow(
      expect.objectContaining({ code: 'geometry/frame-velocity' }),
    );
  });
});
