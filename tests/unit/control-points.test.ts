import { fitControlPoints, leaveOneOut } from '@wakeloom/tracker/detections/control-points';
import { convexHull, inConvexHull } from '@wakeloom/tracker/math/convex-hull';
import { describe, expect, it } from 'vitest';
import { type ControlPoint, controlPoints, gridPoints, HOMOGRAPHY, POLYNOMIAL } from '../helpers/control-points.js';
import { uniform } from '../helpers/detections.js';

/** Largest distance between the fitted map and the true one over places inside the field. */
function worst(
  geometry: Parameters<typeof fitControlPoints>[0],
  truth: (x: number, y: number) => readonly [number, number],
  size = 1,
): number {
  const { map } = fitControlPoints(geometry);
  const random = uniform(9);
  const x = Float64Array.from({ length: 200 }, () => random() * 1000 * size);
  const y = Float64Array.from({ length: 200 }, () => random() * 800 * size);
  const expected = Array.from(x, (value, i) => truth(value, y[i]!));
  map(x, y, new Float64Array(0), x.length);
  return Math.max(...expected.map(([u, v], i) => Math.max(Math.abs(x[i]! - u), Math.abs(y[i]! - v))));
}

describe('map from control points', () => {
  it.each(['affine', 'polynomial-2', 'polynomial-3'] as const)('recovers a true %s map exactly', (map) => {
    const truth = POLYNOMIAL[map];
    // The field is about 50 mm wide: 1e-12 of it is condition (below 100) times rounding with room for 50.
    expect(worst(controlPoints(map, gridPoints(6, 5), truth), truth)).toBeLessThan(5e-11);
  });

  it('recovers a known homography from many points and from just four', () => {
    expect(worst(controlPoints('projective', gridPoints(6, 5), HOMOGRAPHY), HOMOGRAPHY)).toBeLessThan(5e-11);
    const corners: [number, number][] = [
      [0, 0],
      [1000, 10],
      [980, 800],
      [5, 790],
    ];
    expect(worst(controlPoints('projective', corners, HOMOGRAPHY), HOMOGRAPHY)).toBeLessThan(5e-11);
  });

  it('takes a true map of lower order for what it is at a higher one', () => {
    const truth = POLYNOMIAL.affine;
    for (const map of ['projective', 'polynomial-2', 'polynomial-3'] as const) {
      expect(worst(controlPoints(map, gridPoints(5, 5), truth), truth)).toBeLessThan(5e-11);
    }
  });

  it.each([1e-9, 1e9])('fits the same hard points in units of %s', (unit) => {
    for (const map of ['affine', 'projective', 'polynomial-2', 'polynomial-3'] as const) {
      const truth = map === 'projective' ? HOMOGRAPHY : POLYNOMIAL[map];
      const scaled = (x: number, y: number): readonly [number, number] => {
        const [u, v] = truth(x / unit, y / unit);
        return [u / unit, v / unit];
      };
      const places = gridPoints(6, 5).map(([x, y]): [number, number] => [x * unit, y * unit]);
      expect(worst(controlPoints(map, places, scaled), scaled, unit) * unit).toBeLessThan(5e-11);
    }
  });

  it('keeps its digits far from the zero of either side', () => {
    const truth = (x: number, y: number): readonly [number, number] => {
      const [u, v] = HOMOGRAPHY(x - 1e6, y + 1e6);
      return [u + 1e5, v];
    };
    const places = gridPoints(6, 5).map(([x, y]): [number, number] => [x + 1e6, y - 1e6]);
    const { residualX, residualY } = fitControlPoints(controlPoints('projective', places, truth));
    // Coordinates of 1e5 carry 1.5e-11; differences of two of them a few of these.
    expect(Math.max(...residualX.map(Math.abs), ...residualY.map(Math.abs))).toBeLessThan(1e-10);
  });

  it('finds the least distances of noisy points for a projective map', () => {
    // At the minimum the residuals are orthogonal to every change of the map: points on the fitted map plus a small
    // share of these residuals must give the same map again, so exactly that share as residuals.
    const noisy = controlPoints('projective', gridPoints(6, 5), HOMOGRAPHY, 0.05, 11);
    const fit = fitControlPoints(noisy);
    const sum = (x: Float64Array, y: Float64Array) => x.reduce((s, r, i) => s + r * r + y[i]! * y[i]!, 0);
    const trueError = noisy.points.reduce((s, [x, y, u, v]) => {
      const [p, q] = HOMOGRAPHY(x, y);
      return s + (u - p) * (u - p) + (v - q) * (v - q);
    }, 0);
    expect(sum(fit.residualX, fit.residualY)).toBeLessThan(trueError);
    const own = noisy.points.map(
      ([x, y, u, v], i): ControlPoint => [x, y, u - fit.residualX[i]!, v - fit.residualY[i]!],
    );
    // Stationary: adding the residuals back on an exact map, shrunk to a small share, must give that same map.
    for (const share of [0, 1e-3]) {
      const points = own.map(
        ([x, y, u, v], i): ControlPoint => [x, y, u + share * fit.residualX[i]!, v + share * fit.residualY[i]!],
      );
      const again = fitControlPoints({ ...noisy, points });
      const expected = Array.from(fit.residualX, (r) => share * r);
      for (const [i, r] of expected.entries()) expect(Math.abs(again.residualX[i]! - r)).toBeLessThan(1e-9);
    }
  });

  it.each(['affine', 'projective', 'polynomial-2', 'polynomial-3'] as const)(
    'states the noise of the points as rms for %s',
    (map) => {
      const truth = map === 'projective' ? HOMOGRAPHY : POLYNOMIAL[map];
      const geometry = controlPoints(map, gridPoints(20, 20), truth, 0.02, 5);
      // Standard deviation of 800 residuals: 0.02 within 4 standard errors, 4 * 0.02 / sqrt(1600).
      expect(Math.abs(fitControlPoints(geometry).rms - 0.02)).toBeLessThan(0.002);
    },
  );

  it.each(['affine', 'projective', 'polynomial-2', 'polynomial-3'] as const)(
    'gives the leave-one-out residuals of brute-force refits for %s',
    (map) => {
      const truth = map === 'projective' ? HOMOGRAPHY : POLYNOMIAL[map];
      const geometry = controlPoints(map, gridPoints(5, 4), truth, 0.05, 3);
      const left = leaveOneOut(geometry);
      for (const [i, [x, y, u, v]] of geometry.points.entries()) {
        const others = { ...geometry, points: geometry.points.filter((_, k) => k !== i) };
        const px = Float64Array.of(x);
        const py = Float64Array.of(y);
        fitControlPoints(others).map(px, py, new Float64Array(0), 1);
        // Both are least squares of the same points in other scalings: equal but for rounding and, for the
        // projective map, the last step of the iteration.
        expect(Math.abs(left.x[i]! - (u - px[0]!))).toBeLessThan(1e-8);
        expect(Math.abs(left.y[i]! - (v - py[0]!))).toBeLessThan(1e-8);
      }
    },
  );

  it('has no leave-one-out residual and no rms without a spare point', () => {
    const geometry = controlPoints(
      'affine',
      [
        [0, 0],
        [10, 0],
        [0, 10],
      ],
      POLYNOMIAL.affine,
    );
    expect(fitControlPoints(geometry).rms).toBeNaN();
    expect([...leaveOneOut(geometry).x]).toEqual([Number.NaN, Number.NaN, Number.NaN]);
  });

  it('gives NaN beyond the horizon of a projective map', () => {
    // w = 1 + 0.001 (x - 500): the horizon lies at x = -500.
    const truth = (x: number, y: number): readonly [number, number] => {
      const w = 1 + 0.001 * (x - 500);
      return [x / w, y / w];
    };
    const { map } = fitControlPoints(controlPoints('projective', gridPoints(5, 5), truth));
    const x = Float64Array.of(-499, -501, 0);
    const y = Float64Array.of(10, 10, 10);
    map(x, y, new Float64Array(0), 3);
    expect(x[0]).toBeLessThan(-1e4);
    expect(x[1]).toBeNaN();
    expect(y[1]).toBeNaN();
    expect(y[2]).toBeCloseTo(20, 9);
  });
});

describe('control points that fix no map', () => {
  it.each([
    ['affine', 3],
    ['projective', 4],
    ['polynomial-2', 6],
    ['polynomial-3', 10],
  ] as const)('%s needs %i', (map, needed) => {
    const random = uniform(8);
    const places = Array.from({ length: needed }, (): [number, number] => [random() * 1000, random() * 800]);
    const truth = POLYNOMIAL.affine;
    expect(fitControlPoints(controlPoints(map, places, truth)).residualX.length).toBe(needed);
    expect(() => fitControlPoints(controlPoints(map, places.slice(1), truth))).toThrow(
      expect.objectContaining({
        code: 'geometry/control-points-too-few',
        details: { points: needed - 1, needed, map },
        message: expect.stringContaining(`at least ${needed}`),
      }),
    );
  });

  it.each(['affine', 'projective', 'polynomial-2', 'polynomial-3'] as const)('on one line, for %s', (map) => {
    for (const angle of [0, 0.3, Math.PI / 2]) {
      const line = Array.from({ length: 12 }, (_, k): [number, number] => [
        500 + 40 * k * Math.cos(angle),
        300 + 40 * k * Math.sin(angle),
      ]);
      const fit = () => fitControlPoints(controlPoints(map, line, POLYNOMIAL.affine));
      expect(fit).toThrow(expect.objectContaining({ code: 'geometry/control-points-collinear' }));
      expect(fit).toThrow(/dump positions/);
    }
    const flat = () => fitControlPoints(controlPoints(map, gridPoints(4, 4), (x) => [x, 2 * x]));
    expect(flat).toThrow(expect.objectContaining({ code: 'geometry/control-points-collinear' }));
    expect(flat).toThrow(/true positions/);
    const place = () => fitControlPoints(controlPoints(map, Array(12).fill([3, 4]), POLYNOMIAL.affine));
    expect(place).toThrow(expect.objectContaining({ code: 'geometry/control-points-collinear' }));
  });

  it('in two columns for a second-order map, on a circle, or three of four on one line', () => {
    const degenerate = expect.objectContaining({ code: 'geometry/control-points-degenerate' });
    const affine = POLYNOMIAL.affine;
    expect(() => fitControlPoints(controlPoints('polynomial-2', gridPoints(2, 8), affine))).toThrow(degenerate);
    expect(() => fitControlPoints(controlPoints('polynomial-3', gridPoints(3, 8), affine))).toThrow(degenerate);
    // Read to 0.01 px, as calibration targets are.
    const circle = Array.from({ length: 30 }, (_, k): [number, number] => [
      Math.round(50000 + 40000 * Math.cos(k)) / 100,
      Math.round(40000 + 40000 * Math.sin(k)) / 100,
    ]);
    expect(() => fitControlPoints(controlPoints('polynomial-2', circle, affine))).toThrow(degenerate);
    const three: [number, number][] = [
      [0, 0],
      [500, 0],
      [1000, 0],
      [300, 700],
    ];
    expect(() => fitControlPoints(controlPoints('projective', three, affine))).toThrow(degenerate);
  });

  it('with a number missing', () => {
    const geometry = controlPoints('affine', gridPoints(3, 3), POLYNOMIAL.affine);
    const points = geometry.points.map((point, i): ControlPoint => (i === 4 ? [1, 2, Number.NaN, 4] : point));
    expect(() => fitControlPoints({ ...geometry, points })).toThrow(
      expect.objectContaining({ code: 'geometry/control-points-not-finite', details: { point: 5 } }),
    );
  });
});

describe('convex hull', () => {
  it('keeps the corners only, counter-clockwise', () => {
    const places = [...gridPoints(4, 3), [500, 400] as [number, number]];
    const hull = convexHull(
      Float64Array.from(places, ([x]) => x),
      Float64Array.from(places, ([, y]) => y),
    );
    expect([...hull]).toEqual([0, 0, 1000, 0, 1000, 800, 0, 800]);
  });

  it('contains each of its points and agrees with all edges for others', () => {
    const random = uniform(6);
    const x = Float64Array.from({ length: 60 }, () => random());
    const y = Float64Array.from({ length: 60 }, () => random());
    const hull = convexHull(x, y);
    for (let i = 0; i < 60; i++) expect(inConvexHull(hull, x[i]!, y[i]!)).toBe(true);
    expect(inConvexHull(hull, 0.5, 0.5)).toBe(true);
    for (const [px, py] of [
      [-0.01, 0.5],
      [1.01, 0.5],
      [0.5, -0.01],
      [0.5, 1.01],
    ] as const) {
      expect(inConvexHull(hull, px, py)).toBe(false);
    }
  });
});
