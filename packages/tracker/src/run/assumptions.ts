import type { GivenSettings } from './given-settings.js';
import type { RunSettings } from './settings.js';

/**
 * Plain sentences about what nobody said and the program therefore took for granted. Uncertainties that nobody
 * stated are the calibration's to tell.
 */
export function assumptionsOf(settings: RunSettings, given: GivenSettings): readonly string[] {
  const sentences: string[] = [];
  const { clock, geometry, fluid, units } = settings;
  if (geometry.kind === 'scale') {
    if (units.length === 'px') sentences.push('No scale is given: lengths are in px.');
    if (given.origin('geometry.y-axis') === 'default') sentences.push('y as written in the dump counts as up.');
    if (given.origin('geometry.origin') === 'default') sentences.push('The origin is the zero of the dump.');
  } else {
    const points = given.value('geometry.control-points.points') as { readonly unit: string | null };
    if (points.unit === null) sentences.push('The control points carry no unit: their true places are taken in mm.');
  }
  if (clock.kind === 'none') sentences.push('No frame rate is given: times are in frames.');
  else if (clock.kind === 'times') sentences.push('The time column is taken to be in s.');
  if (clock.kind === 'bursts' && clock.every === null) {
    sentences.push('The time between bursts is not given: they follow each other by frame number and rate.');
  }
  if (clock.kind === 'pairs') sentences.push('From the first frame on, every two frame numbers form a pair.');
  if (fluid?.kind === 'water') {
    sentences.push(
      `Water is taken as pure and fresh at 0.1 MPa (IAPWS SR6-08): at ${fluid.temperature!.value} degC ` +
        `density ${fluid.density.toFixed(2)} kg/m3, kinematic viscosity ${(fluid.kinematicViscosity * 1e6).toFixed(4)} mm2/s.`,
    );
  }
  return sentences;
}
