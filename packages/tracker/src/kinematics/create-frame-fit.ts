import type { FitParameters } from './fit-parameters.js';
import type { FrameFit } from './frame-fit.js';
import { PairFit } from './pair-fit.js';
import { RollingFit } from './rolling-fit.js';

/** The fit that suits the clock: along pathlines, or of image pairs. */
export function createFrameFit(parameters: FitParameters): FrameFit {
  return parameters.pairs ? new PairFit(parameters) : new RollingFit(parameters);
}
