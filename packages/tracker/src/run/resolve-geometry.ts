import type { Quantity } from '../core/quantity.js';
import type { GivenSettings } from './given-settings.js';
import { quantityIn } from './parse-quantity.js';
import { itemsOf, placeIn, type RunUnits, speedIn } from './resolve-units.js';
import type { QuantityVector, WrittenBody, WrittenPoints } from './setting-kinds.js';
import type { Body, FrameMotion, GeometrySettings, Region } from './settings.js';
import { findUnit } from './units.js';

const SCALE_ONLY = [
  'geometry.scale-z',
  'geometry.origin',
  'geometry.rotation',
  'geometry.y-axis',
  'geometry.pixel-origin',
];

/** Control points that a map of each kind needs, one for every two of its free parameters. */
const FEWEST_POINTS = { affine: 3, projective: 4, 'polynomial-2': 6, 'polynomial-3': 10 } as const;

function frameMotion(given: GivenSettings, units: RunUnits): FrameMotion {
  const written = given.vector('geometry.tow-velocity');
  if (written === null) return { velocity: null };
  const [x = 0, y = 0, z = 0] = itemsOf(written).map(
    (item) => speedIn(given, units, 'geometry.tow-velocity', item).value,
  );
  return { velocity: [x, y, z] };
}

function region(given: GivenSettings, units: RunUnits): Region | null {
  const side = (axis: 'x' | 'y' | 'z'): readonly [number, number] | null => {
    const key = `geometry.region.${axis}`;
    const written = given.vector(key);
    if (written === null) return null;
    const [low, high] = itemsOf(written).map((item) => placeIn(given, units, key, item)) as [number, number];
    if (low >= high) given.problem(key, `got ${low} to ${high} ${units.length}, expected the smaller first`);
    return [low, high];
  };
  const box = { x: side('x'), y: side('y'), z: side('z') };
  return box.x === null && box.y === null && box.z === null ? null : box;
}

function origin(
  given: GivenSettings,
): Pick<Extract<GeometrySettings, { kind: 'scale' }>, 'origin' | 'originUncertainty'> {
  const written = given.vector('geometry.origin') as QuantityVector | null;
  if (written === null) return { origin: [0, 0, 0], originUncertainty: null };
  if (written.unit !== 'px') {
    given.problem('geometry.origin', `got a point in ${written.unit}, expected px (the origin is a point of the dump)`);
  }
  const [x = 0, y = 0, z = 0] = written.values;
  return { origin: [x, y, z], originUncertainty: written.standardUncertainty };
}

/** Geometry from a scale or from control points, whichever is given; both at once is a problem. */
export function resolveGeometry(given: GivenSettings, units: RunUnits): GeometrySettings {
  const common = { frame: frameMotion(given, units), region: region(given, units) };
  const points = given.value('geometry.control-points.points') as WrittenPoints | null;
  if (points !== null) {
    const map = given.text('geometry.control-points.map') as keyof typeof FEWEST_POINTS;
    for (const key of ['geometry.scale', ...SCALE_ONLY]) {
      if (given.has(key)) given.problem(key, 'got a value beside control points, expected one or the other');
    }
    if (points.rows.length < (FEWEST_POINTS[map] ?? 3)) {
      const got = `got ${points.rows.length} points, expected at least ${FEWEST_POINTS[map]} for the map "${map}"`;
      given.problem('geometry.control-points.points', got);
    }
    return { kind: 'control-points', map, points: points.rows, ...common };
  }
  if (given.has('geometry.control-points.map')) {
    given.problem(
      'geometry.control-points.map',
      'got a map without control points, expected geometry.control-points.points',
    );
  }
  const pixel: Quantity = { value: 1, unit: 'px/px', standardUncertainty: 0 };
  const scale = given.quantity('geometry.scale');
  const scaleZ = given.quantity('geometry.scale-z');
  const rotation = given.quantity('geometry.rotation');
  return {
    kind: 'scale',
    scale: scale ?? pixel,
    scaleZ: scaleZ === null ? null : resolveScaleZ(given, scale, scaleZ),
    ...origin(given),
    rotation:
      rotation === null ? { value: 0, unit: 'deg', standardUncertainty: null } : quantityIn(rotation, 'deg', 'angle'),
    yAxis: given.text('geometry.y-axis') as 'up' | 'down',
    pixelOrigin: given.text('geometry.pixel-origin') as 'corner' | 'centre',
    ...common,
  };
}

function resolveScaleZ(given: GivenSettings, scale: Quantity | null, scaleZ: Quantity): Quantity {
  if (scale !== null) return quantityIn(scaleZ, scale.unit, 'scale');
  given.problem('geometry.scale-z', 'got a scale along z alone, expected geometry.scale beside it');
  return scaleZ;
}

/** Bodies in the length unit of the results. */
export function resolveBodies(given: GivenSettings, units: RunUnits): readonly Body[] {
  const written = (given.value('body') ?? []) as readonly WrittenBody[];
  return written.map((body): Body => {
    if (body.kind === 'circle') {
      const [x = 0, y = 0] = itemsOf(body.centre).map((item) => placeIn(given, units, 'body', item));
      return { kind: 'circle', centre: [x, y], diameter: placeIn(given, units, 'body', body.diameter) };
    }
    if (findUnit(body.unit, 'length') === null) given.problem('body', `got the unit ${body.unit}, expected a length`);
    const points = body.points.map(([x = 0, y = 0]): readonly [number, number] => {
      const at = (value: number) =>
        placeIn(given, units, 'body', { value, unit: body.unit, standardUncertainty: null });
      return [at(x), at(y)];
    });
    return { kind: 'polygon', points };
  });
}
