import { fitFlags } from '../screening/flags.js';
import type { FitParameters } from './fit-parameters.js';
import { fitReach } from './fit-parameters.js';
import { MARK } from './marks.js';
import { LEAST_REDUNDANCY, PathlineFitter } from './pathline-fitter.js';

/** Farthest reach whose frames on one side fit 26 bits, and those on both sides a number without rounding. */
const MOST_REACH = 26;

/** Patterns kept at most; beyond it they are forgotten and made anew (same bits, so nothing depends on it). */
const MOST_PATTERNS = 4096;

/** All that the first fit of a sample has from which frames in reach its pathline was seen in. */
export interface WindowPattern {
  /** Samples of the window before and behind the sample itself. */
  readonly before: number;
  readonly behind: number;
  /** Weights of position, velocity and acceleration for each sample of the window. [3 (before + 1 + behind)] */
  readonly weights: Float64Array;
  /** Roots of the noise gains. */
  readonly positionRoot: number;
  readonly velocityRoot: number;
  readonly accelerationRoot: number;
  /** Root of the redundancy of the sample's residual; 0 where that says nothing. */
  readonly redundancy: number;
  /** Flags and bits of `MARK` that follow. */
  readonly flags: number;
  readonly marks: number;
}

/**
 * Windows and weights by pattern of seen frames, for even clocks: each is made once by `PathlineFitter` on a pathline
 * of that pattern and looked up afterwards. Mutable: one a user.
 */
export class WindowPatterns {
  private readonly parameters: FitParameters;
  private readonly reach: number;
  private readonly fitter: PathlineFitter;
  private readonly known = new Map<number, WindowPattern>();

  constructor(parameters: FitParameters) {
    this.parameters = parameters;
    this.reach = fitReach(parameters);
    this.fitter = new PathlineFitter(parameters, false, 2 * this.reach + 1);
  }

  /** Whether these parameters have patterns: the clock is even, and the reach fits a key. */
  static serve(parameters: FitParameters): boolean {
    return parameters.interval !== null && fitReach(parameters) <= MOST_REACH;
  }

  /** The pattern of a sample whose pathline was seen in the frames of two masks: bit d is the frame d + 1 before (behind) its own. */
  of(before: number, behind: number): WindowPattern {
    const key = before * 2 ** this.reach + behind;
    const known = this.known.get(key);
    if (known !== undefined) return known;
    const made = this.make(before, behind);
    if (this.known.size >= MOST_PATTERNS) this.known.clear();
    this.known.set(key, made);
    return made;
  }

  private make(before: number, behind: number): WindowPattern {
    const { fitter, reach, parameters } = this;
    const { frame } = fitter;
    let n = 0;
    for (let d = reach; d > 0; d--) if (((before >>> (d - 1)) & 1) === 1) frame[n++] = -d;
    const own = n;
    frame[n++] = 0;
    for (let d = 1; d <= reach; d++) if (((behind >>> (d - 1)) & 1) === 1) frame[n++] = d;
    fitter.count = n;
    fitter.place(own, own + 1);
    const lo = fitter.low[own]!;
    const hi = fitter.high[own]!;
    const made = fitter.weightsOf(own);
    const weights = new Float64Array(3 * made.count);
    for (let j = 0; j < made.count; j++) {
      weights[3 * j] = made.position[j]!;
      weights[3 * j + 1] = made.velocity[j]!;
      weights[3 * j + 2] = made.acceleration[j]!;
    }
    const half = (parameters.span - 1) / 2;
    const redundancy = 1 - made.positionGain;
    return {
      before: own - lo,
      behind: hi - own,
      weights,
      positionRoot: made.positionRoot,
      velocityRoot: made.velocityRoot,
      accelerationRoot: made.accelerationRoot,
      redundancy: redundancy < LEAST_REDUNDANCY ? 0 : Math.sqrt(redundancy),
      flags: fitFlags(
        fitter.reachFirst[own]!,
        fitter.reachLast[own]!,
        0,
        half,
        frame[lo]!,
        frame[hi]!,
        own - lo,
        hi - own,
      ),
      marks: ((behind & 1) !== 0 ? MARK.inNextFrame : 0) | ((before & 3) !== 0 ? MARK.inTwoFramesBefore : 0),
    };
  }
}
