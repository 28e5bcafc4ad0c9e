import type { Prior } from '../pipeline/stages.js';
import type { Body, RunSettings } from '../run/settings.js';

/** All that the fit of a window depends on besides its rows; plain values, so that it can cross a worker border. */
export interface FitParameters {
  /** Standard deviation of the position noise per axis, length unit. */
  readonly noise: readonly [number, number, number];
  /** Frames in the window of the local fit, odd, at least 3. */
  readonly span: number;
  /** Degree of the local polynomial. */
  readonly order: 1 | 2 | 3;
  /** Missing frames that a pathline may cross. */
  readonly bridge: number;
  /** Time from frame number to frame number where the clock is even, else null: then the frames' own times count. */
  readonly interval: number | null;
  /** Image pairs: one sample a linked pair, at its mid-point. */
  readonly pairs: boolean;
  /** Link risk above which a sample is flagged `doubtful-link`. */
  readonly riskLimit: number;
  readonly medianThreshold: number;
  readonly medianNeighbours: number;
  /** Velocity noise in the normalised median test, velocity unit; null: the sample's own standard error. */
  readonly medianEpsilon: number | null;
  /** Multiple of the expected residual above which a position is `off-fit`. */
  readonly offFitLimit: number;
  readonly bodies: readonly Body[];
  /** Width of the rim of a body, length unit. */
  readonly rim: number;
}

/**
 * Five standard deviations of a residual: among Gaussian residuals 1 in 1.7 million goes beyond it, so what does
 * is no noise. Common practice for gross errors, no source.
 */
export const OFF_FIT_LIMIT = 5;

/**
 * The rim of a body in noise standard deviations. Detections that noise has pushed across the surface were left
 * out with the inside of the body, so closer than this the positions that remain are one-sided: 3 covers 99.7 %.
 */
export const RIM_NOISE = 3;

/** Parameters of the fit from the settings of a run and what the first look at its data gave. */
export function fitParameters(settings: RunSettings, prior: Prior): FitParameters {
  const { clock, screening } = settings;
  const even = clock.kind === 'rate' || clock.kind === 'bursts' ? prior.frameStep / clock.rate.value : null;
  return {
    noise: prior.noise,
    span: prior.span,
    order: settings.smoothing.order,
    bridge: settings.linking.bridge,
    interval: clock.kind === 'none' ? prior.frameStep : even,
    pairs: clock.kind === 'pairs',
    riskLimit: settings.linking.riskLimit,
    medianThreshold: screening.medianThreshold,
    medianNeighbours: screening.medianNeighbours,
    medianEpsilon: null,
    offFitLimit: OFF_FIT_LIMIT,
    bodies: settings.body,
    rim: RIM_NOISE * Math.max(prior.noise[0], prior.noise[1]),
  };
}

/**
 * Farthest frame, before or behind, that a single local fit can look at: the span, one-sided at the end of a pathline,
 * or as far as gaps can push the samples that the polynomial needs, whichever is more.
 */
export function fitReach(parameters: FitParameters): number {
  return Math.max(parameters.span - 1, parameters.order * (parameters.bridge + 1));
}

/**
 * Samples a fit is given where the pathline has them in reach: one more than the polynomial has coefficients, though
 * no more than the span where that still determines it.
 */
export function fewestInFit(parameters: FitParameters): number {
  return Math.max(parameters.order + 1, Math.min(parameters.span, parameters.order + 2));
}

/**
 * Frames of overlap on either side of the core, so that results of the core do not depend on where the run is cut.
 * A sample's last fit looks `reach` frames far at which samples are screened; a sample is screened by neighbours one
 * frame off; their fit again looks `reach` far at which positions are off their fit; that is decided by comparing
 * residuals half a span apart, each from a fit that looks `reach` far. Image pairs need only their partner.
 */
export function fitLag(parameters: FitParameters): number {
  if (parameters.pairs) return 1;
  return 3 * fitReach(parameters) + (parameters.span - 1) / 2 + 1;
}
