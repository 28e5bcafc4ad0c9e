import type { GeometrySettings } from '@wakeloom/tracker';
import { uniform } from './detections.js';

type ControlPointGeometry = Extract<GeometrySettings, { kind: 'control-points' }>;
/** Dump x, dump y, true x, true y. */
export type ControlPoint = readonly [number, number, number, number];
/** A true map from dump to true coordinates. */
export type TrueMap = (x: number, y: number) => readonly [number, number];

/** A camera that looks at the sheet askew: 1000 x 800 px to some 50 x 40 mm, w from 0.9 to 1.2. Invented. */
export const HOMOGRAPHY: TrueMap = (x, y) => {
  const w = 1.2 - 0.0002 * x - 0.0001 * y;
  return [(0.05 * x - 0.004 * y - 20) / w, (0.003 * x - 0.052 * y + 15) / w];
};

const affine: TrueMap = (x, y) => [0.05 * x + 0.002 * y - 25, 0.0015 * x - 0.05 * y + 20];
const second: TrueMap = (x, y) => {
  const [u, v] = affine(x, y);
  return [u + 2e-6 * x * x - 3e-6 * x * y + 1e-6 * y * y, v - 1e-6 * x * x + 2e-6 * x * y + 4e-6 * y * y];
};
const third: TrueMap = (x, y) => {
  const [u, v] = second(x, y);
  return [
    u + 1e-9 * x * x * x - 2e-9 * x * x * y + 3e-9 * x * y * y - 1e-9 * y * y * y,
    v - 2e-9 * x * x * x + 1e-9 * x * x * y - 1e-9 * x * y * y + 2e-9 * y * y * y,
  ];
};
/** Maps that each polynomial order can follow exactly: a field of some 50 x 40 mm. Invented. */
export const POLYNOMIAL = { affine, 'polynomial-2': second, 'polynomial-3': third };

/** Dots of a target over 1000 x 800 px, borders included. */
export function gridPoints(columns: number, rows: number): [number, number][] {
  return Array.from({ length: columns * rows }, (_, k) => [
    ((k % columns) * 1000) / (columns - 1),
    (Math.floor(k / columns) * 800) / (rows - 1),
  ]);
}

/** Settings with these places and their true positions, with uniform noise of the given standard deviation. */
export function controlPoints(
  map: ControlPointGeometry['map'],
  places: readonly (readonly [number, number])[],
  truth: TrueMap,
  noise = 0,
  seed = 1,
): ControlPointGeometry {
  const random = uniform(seed);
  // Uniform over a width of sqrt(12) standard deviations.
  const error = () => (random() - 0.5) * Math.sqrt(12) * noise;
  const points = places.map(([x, y]): ControlPoint => {
    const [u, v] = truth(x, y);
    return [x, y, u + error(), v + error()];
  });
  return { kind: 'control-points', map, points, frame: { velocity: null }, region: null };
}
