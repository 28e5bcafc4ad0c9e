import { scaleMap } from '@wakeloom/tracker/detections/geometry';
import { regionBounds } from '@wakeloom/tracker/detections/region';
import { turn } from '@wakeloom/tracker/math/turn';
import { describe, expect, it } from 'vitest';
import { scaleGeometry } from '../helpers/detections.js';

type Parts = Parameters<typeof scaleGeometry>[0];
const by = (value: number) => ({ value, unit: 'mm/px', standardUncertainty: 0 });
const degrees = (value: number) => ({ value, unit: 'deg', standardUncertainty: 0 });

/** Maps one point by the program. */
function mapped(parts: Parts, point: readonly [number, number, number]): number[] {
  const x = Float64Array.of(point[0]);
  const y = Float64Array.of(point[1]);
  const z = Float64Array.of(point[2]);
  scaleMap(scaleGeometry(parts), 3)(x, y, z, 1);
  return [x[0]!, y[0]!, z[0]!];
}

describe('geometry by scale', () => {
  it('leaves everything as it is when neutral', () => {
    expect(mapped({}, [3.25, -7.5, 11])).toEqual([3.25, -7.5, 11]);
  });

  it('shifts, flips, turns and scales in this order', () => {
    // By hand: (12, 20) - (10, 16) = (2, 4); y down: (2, -4); the result's x axis is the dump's turned 90 degrees
    // counter-clockwise, so along it lies -4 and across it -2; times 0.5.
    const parts: Parts = { scale: by(0.5), origin: [10, 16, 2], yAxis: 'down', rotation: degrees(90) };
    expect(mapped(parts, [12, 20, 8])).toEqual([-2, -1, 3]);
  });

  it('puts a point on the turned x axis at y = 0', () => {
    const [x, y] = mapped({ rotation: degrees(30) }, [Math.sqrt(3), 1, 0]);
    expect(x).toBeCloseTo(2, 15);
    expect(y).toBeCloseTo(0, 15);
  });

  it('counts the origin from the outer corner: a dump that counts from the first pixel centre gains half a pixel', () => {
    const corner = mapped({ scale: by(0.25), origin: [4, 8, 0], yAxis: 'down' }, [6.5, 3.5, 0]);
    const centre = mapped({ scale: by(0.25), origin: [4, 8, 0], yAxis: 'down', pixelOrigin: 'centre' }, [6, 3, 0]);
    expect(centre).toEqual(corner);
    expect(corner).toEqual([0.625, 1.125, 0]);
  });

  it('scales z by its own factor where it has one, also a reversing one', () => {
    expect(mapped({ scale: by(0.5), scaleZ: by(-2), origin: [0, 0, 1] }, [2, 4, 4])).toEqual([1, 2, -6]);
    expect(mapped({ scale: by(0.5) }, [2, 4, 4])).toEqual([1, 2, 2]);
  });

  it('does not touch z in the plane and gives one form of zero', () => {
    const x = Float64Array.of(0);
    const y = Float64Array.of(0);
    scaleMap(scaleGeometry({ yAxis: 'down' }), 2)(x, y, new Float64Array(0), 1);
    expect(Object.is(x[0], 0)).toBe(true);
    expect(Object.is(y[0], 0)).toBe(true);
  });

  it.each<[string, string, Parts]>([
    ['geometry/scale', 'scale 0', { scale: by(0) }],
    ['geometry/scale', 'negative scale', { scale: by(-1) }],
    ['geometry/scale', 'scale along z 0', { scaleZ: by(0) }],
    ['geometry/origin', 'origin nowhere', { origin: [0, Number.NaN, 0] }],
    ['geometry/rotation', 'no angle', { rotation: degrees(Number.POSITIVE_INFINITY) }],
  ])('refuses with %s: %s', (code, _, parts) => {
    expect(() => scaleMap(scaleGeometry(parts), 2)).toThrow(expect.objectContaining({ code }));
  });
});

describe('turn', () => {
  it('is exact at quarter turns', () => {
    const quarters = [
      [1, 0],
      [0, 1],
      [-1, 0],
      [0, -1],
    ];
    for (let k = -9; k <= 9; k++) {
      const [cosine, sine] = turn(90 * k);
      const expected = quarters[((k % 4) + 4) % 4]!;
      expect([cosine + 0, sine + 0]).toEqual(expected);
    }
  });

  it('agrees with cosine and sine to 2 units in the last place of 1', () => {
    for (let degree = -400; degree <= 400; degree += 0.37) {
      const [cosine, sine] = turn(degree);
      // The argument in radians is itself rounded: |angle| 1.1e-16 of it counts against the library function.
      const argument = Math.abs((degree * Math.PI) / 180) * 2.3e-16;
      expect(Math.abs(cosine - Math.cos((degree * Math.PI) / 180))).toBeLessThan(4.5e-16 + argument);
      expect(Math.abs(sine - Math.sin((degree * Math.PI) / 180))).toBeLessThan(4.5e-16 + argument);
      expect(Math.abs(cosine * cosine + sine * sine - 1)).toBeLessThan(6e-16);
    }
  });

  it('knows sin 30 and cos 60 degrees, mirrors and whole turns', () => {
    expect(turn(30)[1]).toBeCloseTo(0.5, 15);
    expect(turn(60)[0]).toBeCloseTo(0.5, 15);
    expect(turn(-17.25)).toEqual([turn(17.25)[0], -turn(17.25)[1]]);
    expect(turn(360 + 17.25)).toEqual(turn(17.25));
  });
});

describe('region of interest', () => {
  it('leaves open what is not given, but not to infinity', () => {
    const bounds = regionBounds({ x: [1, 2], y: null, z: [3, 4] }, 2);
    expect(bounds.min).toEqual([1, -Number.MAX_VALUE, -Number.MAX_VALUE]);
    expect(bounds.max).toEqual([2, Number.MAX_VALUE, Number.MAX_VALUE]);
    expect(regionBounds({ x: null, y: null, z: [3, 4] }, 3).max[2]).toBe(4);
  });

  it('refuses bounds in the wrong order', () => {
    expect(() => regionBounds({ x: null, y: [2, 2], z: null }, 2)).toThrow(
      expect.objectContaining({ code: 'geometry/region', details: { axis: 'y', from: 2, to: 2 } }),
    );
  });
});
