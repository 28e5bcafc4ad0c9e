import type { Quantity } from '../core/quantity.js';
import type { SystematicLine } from '../store/run-record.js';
import type { RunSettings } from './settings.js';

/** Standard uncertainty as a share of the value, or null where unknown or taken as exact. */
function relative(quantity: Quantity): number | null {
  const { value, standardUncertainty } = quantity;
  return standardUncertainty === null || standardUncertainty === 0 ? null : standardUncertainty / Math.abs(value);
}

/**
 * Systematic uncertainties that the settings carry: of scale, clock, origin and angle. Each is one standard
 * uncertainty that is common to the whole run and does not shrink with the number of samples (JCGM 100:2008, 5.1.2
 * with the sensitivities of x = s X, u = s X f, a = s X f^2, to first order). Unknown ones give no line: that they
 * are unknown stands among the assumptions. Those of a fitted map come from the calibration itself.
 */
export function systematicLines(settings: RunSettings): readonly SystematicLine[] {
  const lines: SystematicLine[] = [];
  const add = (source: string, size: number | null, unit: string, effect: string) => {
    if (size !== null && size !== 0) lines.push({ source, standardUncertainty: size, unit, effect });
  };
  const { geometry, clock } = settings;
  if (geometry.kind === 'scale') {
    const zApart = geometry.scaleZ !== null;
    const along = zApart ? ' along x and y' : '';
    add('geometry.scale', relative(geometry.scale), '1', `share of every length, velocity and acceleration${along}`);
    if (geometry.scaleZ) add('geometry.scale-z', relative(geometry.scaleZ), '1', 'share of z, w and az');
    const shift = geometry.originUncertainty === null ? null : geometry.originUncertainty * geometry.scale.value;
    add('geometry.origin', shift, settings.units.length, 'shift of every position, in each axis; velocities keep');
    const turn = geometry.rotation.standardUncertainty;
    add('geometry.rotation', turn, 'deg', 'turn of every position and vector in the plane; sizes keep');
  }
  if (clock.kind === 'rate' || clock.kind === 'bursts') {
    add('clock.rate', relative(clock.rate), '1', 'share of every velocity, and twice that share of every acceleration');
  }
  if (clock.kind === 'pairs') {
    add('clock.pairs.delay', relative(clock.delay), '1', 'share of every velocity');
    add('clock.pairs.rate', relative(clock.rate), '1', 'share of the time between pairs; velocities keep');
  }
  return lines;
}
