import type { Quantity } from '../core/quantity.js';
import type { RunSettings } from '../run/settings.js';
import type { SystematicLine } from '../store/run-record.js';
import { type ControlPointGeometry, fitControlPoints, leaveOneOut } from './control-points.js';
import type { ScaleGeometry } from './geometry.js';

/** How good a fitted map is. Residuals are true minus mapped, in the length unit of the results. [points] each */
export interface MapSummary {
  readonly map: ControlPointGeometry['map'];
  readonly points: number;
  readonly residualX: Float64Array;
  readonly residualY: Float64Array;
  /** Residuals about the map fitted to all other points; NaN where those do not determine it. */
  readonly leaveOneOutX: Float64Array;
  readonly leaveOneOutY: Float64Array;
  /** Standard deviation of one coordinate about the map (see `FittedMap.rms`); NaN without spare points. */
  readonly rms: number;
  /** Root mean square of the leave-one-out residuals of one coordinate; NaN where there are none. */
  readonly leaveOneOutRms: number;
  /** Convex hull in dump coordinates, counter-clockwise: x, y in turn. */
  readonly hull: Float64Array;
}

/** What is known of the calibration before any data: for run.json and the report. */
export interface CalibrationSummary {
  /** Null where the geometry is a scale. */
  readonly map: MapSummary | null;
  /** Systematic uncertainties of clock and geometry, those that are stated and not zero. */
  readonly systematic: readonly SystematicLine[];
  /** Plain sentences: uncertainties that are not known, points that fit badly. */
  readonly remarks: readonly string[];
}

/** A leave-one-out residual this many times the median one is worth a look at that point (common practice, no source). */
const SUSPICIOUS = 5;

/**
 * Residuals, hull and systematic uncertainties that follow from the settings. Throws what `fitControlPoints`
 * throws. Cost: one refit a control point.
 */
export function calibrationSummary(settings: RunSettings): CalibrationSummary {
  const systematic: SystematicLine[] = [];
  const remarks: string[] = [];
  const { geometry } = settings;
  const map = geometry.kind === 'control-points' ? mapSummary(geometry) : null;
  if (geometry.kind === 'scale') scaleLines(geometry, settings.units.length, systematic, remarks);
  else if (map !== null) mapLines(map, settings.units.length, systematic, remarks);
  clockLines(settings, systematic, remarks);
  return { map, systematic, remarks };
}

function mapSummary(geometry: ControlPointGeometry): MapSummary {
  const fit = fitControlPoints(geometry);
  const left = leaveOneOut(geometry);
  let sum = 0;
  let count = 0;
  for (let i = 0; i < left.x.length; i++) {
    if (Number.isNaN(left.x[i]!)) continue;
    sum += left.x[i]! * left.x[i]! + left.y[i]! * left.y[i]!;
    count += 2;
  }
  return {
    map: geometry.map,
    points: geometry.points.length,
    residualX: fit.residualX,
    residualY: fit.residualY,
    leaveOneOutX: left.x,
    leaveOneOutY: left.y,
    rms: fit.rms,
    leaveOneOutRms: count > 0 ? Math.sqrt(sum / count) : Number.NaN,
    hull: fit.hull,
  };
}

function mapLines(map: MapSummary, unit: string, systematic: SystematicLine[], remarks: string[]): void {
  if (Number.isNaN(map.rms)) {
    remarks.push(
      `The ${map.points} control points are just enough for the map "${map.map}": they leave no residual, so its uncertainty is not known.`,
    );
    return;
  }
  systematic.push({
    source: `calibration map (${map.map}, ${map.points} control points)`,
    standardUncertainty: map.rms,
    unit,
    effect: 'positions by this amount, from place to place; velocities by its change along a displacement',
  });
  const sizes = Array.from(map.leaveOneOutX, (x, i) => Math.hypot(x, map.leaveOneOutY[i]!));
  const undetermined = sizes.flatMap((size, i) => (Number.isNaN(size) ? [i + 1] : []));
  if (undetermined.length > 0) {
    remarks.push(
      `Without control point ${undetermined.join(' or ')} the map "${map.map}" is not determined: nothing checks what these points say.`,
    );
  }
  const known = sizes.filter((size) => !Number.isNaN(size)).sort((a, b) => a - b);
  if (known.length === 0) return;
  const median = known[known.length >> 1]!;
  const largest = known[known.length - 1]!;
  if (largest > SUSPICIOUS * median) {
    remarks.push(
      `Control point ${sizes.indexOf(largest) + 1} lies ${largest.toPrecision(3)} ${unit} off the map of all others, ${(largest / median).toFixed(1)} times the median: look at its coordinates.`,
    );
  }
}

function scaleLines(geometry: ScaleGeometry, unit: string, systematic: SystematicLine[], remarks: string[]): void {
  relative('scale', geometry.scale, 'all lengths, velocities and accelerations by this share', systematic, remarks);
  if (geometry.scaleZ !== null) {
    relative('scale along z', geometry.scaleZ, 'z, w and z accelerations by this share', systematic, remarks);
  }
  if (geometry.originUncertainty !== null && geometry.originUncertainty > 0) {
    systematic.push({
      source: 'origin',
      standardUncertainty: geometry.originUncertainty * geometry.scale.value,
      unit,
      effect: 'all positions together by this amount; velocities not at all',
    });
  }
  const angle = geometry.rotation.standardUncertainty;
  if (angle !== null && angle > 0) {
    systematic.push({
      source: 'angle',
      standardUncertainty: angle,
      unit: 'deg',
      effect: 'all directions together by this angle; a velocity across by its sine times the velocity along',
    });
  }
}

function clockLines(settings: RunSettings, systematic: SystematicLine[], remarks: string[]): void {
  const { clock } = settings;
  if (clock.kind === 'none' || clock.kind === 'times') return;
  if (clock.kind === 'pairs') {
    relative('delay of image pairs', clock.delay, 'all velocities by this share', systematic, remarks);
    return;
  }
  relative(
    'rate',
    clock.rate,
    'all times and velocities by this share, accelerations by twice this',
    systematic,
    remarks,
  );
}

/** Relative standard uncertainty, unit 1; a remark where it is not stated; nothing where it is zero. */
function relative(
  source: string,
  quantity: Quantity,
  effect: string,
  systematic: SystematicLine[],
  remarks: string[],
): void {
  const { standardUncertainty, value, unit } = quantity;
  if (standardUncertainty === null) {
    remarks.push(
      `No uncertainty is stated for the ${source} (${value} ${unit}): its share in the systematic uncertainty is not known.`,
    );
  } else if (standardUncertainty > 0) {
    systematic.push({ source, standardUncertainty: standardUncertainty / Math.abs(value), unit: '1', effect });
  }
}
