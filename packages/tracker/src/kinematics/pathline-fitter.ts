import type { FitParameters } from './fit-parameters.js';
import { fewestInFit, fitReach } from './fit-parameters.js';
import type { FitWeights } from './local-fit.js';
import { WeightTable } from './weight-table.js';

/** What `refit` did. */
export const REFIT = {
  /** No sample of the fit is excluded: it stands. */
  none: 0,
  made: 1,
  /** Too few samples would remain for the polynomial: the fit stands, and rests on excluded ones. */
  tooFew: 2,
} as const;

/** Below this share of the noise variance a residual says nothing: the fit passes through the sample. */
export const LEAST_REDUNDANCY = 1e-6;

/**
 * Fits one pathline after the other. The columns below hold the pathline that the caller has loaded last, one entry a
 * sample in frame order; buffers are kept from pathline to pathline. Mutable: one fitter a user.
 */
export class PathlineFitter {
  readonly parameters: FitParameters;
  readonly deep: boolean;
  /** Samples loaded. */
  count = 0;
  /** Loaded by the caller: row and place of the frame among those held, frame number, time, measured position. */
  readonly row: Uint32Array;
  readonly index: Uint32Array;
  readonly frame: Int32Array;
  readonly time: Float64Array;
  readonly x: Float64Array;
  readonly y: Float64Array;
  readonly z: Float64Array;
  /** First and last sample of the window of each fit, and frame numbers of the first and last sample in reach. */
  readonly low: Int32Array;
  readonly high: Int32Array;
  readonly reachFirst: Int32Array;
  readonly reachLast: Int32Array;
  /** Loaded by the caller: 1 for samples that take no part in `refit`. */
  readonly excluded: Uint8Array;
  /** Results: position, velocity, acceleration per axis; roots of the noise gains. */
  readonly px: Float64Array;
  readonly py: Float64Array;
  readonly pz: Float64Array;
  readonly vx: Float64Array;
  readonly vy: Float64Array;
  readonly vz: Float64Array;
  readonly ax: Float64Array;
  readonly ay: Float64Array;
  readonly az: Float64Array;
  readonly positionRoot: Float64Array;
  readonly velocityRoot: Float64Array;
  readonly accelerationRoot: Float64Array;
  /** Distance of the measured position from the fit over its expected standard deviation, largest over the axes. */
  readonly residual: Float64Array;

  private readonly fewest: number;
  private readonly table: WeightTable;
  private readonly members: Int32Array;

  /** `longest`: most samples loaded at once. */
  constructor(parameters: FitParameters, deep: boolean, longest: number) {
    this.parameters = parameters;
    this.deep = deep;
    const n = longest;
    const column = () => new Float64Array(n);
    this.row = new Uint32Array(n);
    this.index = new Uint32Array(n);
    this.frame = new Int32Array(n);
    this.low = new Int32Array(n);
    this.high = new Int32Array(n);
    this.reachFirst = new Int32Array(n);
    this.reachLast = new Int32Array(n);
    this.excluded = new Uint8Array(n);
    this.time = column();
    this.x = column();
    this.y = column();
    this.z = column();
    this.px = column();
    this.py = column();
    this.pz = column();
    this.vx = column();
    this.vy = column();
    this.vz = column();
    this.ax = column();
    this.ay = column();
    this.az = column();
    this.positionRoot = column();
    this.velocityRoot = column();
    this.accelerationRoot = column();
    this.residual = column();
    this.fewest = fewestInFit(parameters);
    // Widened to the fewest, on both sides at once.
    const most = Math.max(parameters.span, this.fewest + 1);
    this.table = new WeightTable(most, parameters.order, parameters.interval);
    this.members = new Int32Array(most);
  }

  /**
   * Sets the windows of samples `from .. to - 1`: samples within half a span on either side; where the pathline
   * ends sooner on one side the window shifts, so that it still covers the span. Where gaps leave a side empty or the
   * whole with fewer samples than `fewestInFit`, the window widens to the next ones. Nothing farther than `fitReach`
   * frames from the sample is looked at.
   */
  place(from: number, to: number): void {
    const { frame, low, high, reachFirst, reachLast, count, fewest } = this;
    const span = this.parameters.span;
    const reach = fitReach(this.parameters);
    const half = (span - 1) / 2;
    let a = 0;
    let b = 0;
    let lo = 0;
    let hi = 0;
    for (let i = from; i < to; i++) {
      const own = frame[i]!;
      while (own - frame[a]! > reach) a++;
      if (b < i) b = i;
      while (b + 1 < count && frame[b + 1]! - own <= reach) b++;
      let first = own - half;
      if (first < frame[a]!) first = frame[a]!;
      let last = first + span - 1;
      if (last > frame[b]!) {
        last = frame[b]!;
        first = last - span + 1;
        if (first < frame[a]!) first = frame[a]!;
      }
      // Window borders never move back from one sample to the next.
      while (frame[lo]! < first) lo++;
      if (hi < i) hi = i;
      while (hi + 1 < count && frame[hi + 1]! <= last) hi++;
      low[i] = lo;
      high[i] = hi;
      reachFirst[i] = frame[a]!;
      reachLast[i] = frame[b]!;
      if (hi - lo + 1 < fewest || lo === i || hi === i) this.widen(i, a, b);
    }
  }

  /** Widens the window of sample i within samples a .. b: none of its sides empty, and samples enough. */
  private widen(i: number, a: number, b: number): void {
    const { frame, low, high, fewest } = this;
    let lo = low[i]!;
    let hi = high[i]!;
    if (lo === i && a < i) lo--;
    if (hi === i && b > i) hi++;
    while (hi - lo + 1 < fewest && (lo > a || hi < b)) {
      const before = lo > a ? frame[i]! - frame[lo - 1]! : Number.POSITIVE_INFINITY;
      const behind = hi < b ? frame[hi + 1]! - frame[i]! : Number.POSITIVE_INFINITY;
      // Both where they are equally far: a fit must not depend on the direction of time.
      if (before <= behind) lo--;
      if (behind <= before) hi++;
    }
    low[i] = lo;
    high[i] = hi;
  }

  /** Weights of all samples in the window of sample i, which is set. Borrowed until the next call. */
  weightsOf(i: number): FitWeights {
    const { frame, low, high, table, members } = this;
    const lo = low[i]!;
    const hi = high[i]!;
    const n = hi - lo + 1;
    if (table.even && frame[hi]! - frame[lo]! === n - 1) return table.gapless(n, i - lo);
    for (let j = 0; j < n; j++) members[j] = lo + j;
    return table.at(frame, this.time, members, n, i);
  }

  /** Fits samples `from .. to - 1` over all samples of their windows, and takes their residuals; returns the largest of these. */
  fit(from: number, to: number): number {
    const { low, residual, x, y, z, px, py, pz, deep } = this;
    const [sx, sy, sz] = this.parameters.noise;
    let largest = 0;
    for (let i = from; i < to; i++) {
      const weights = this.weightsOf(i);
      this.apply(i, low[i]!, weights);
      const redundancy = 1 - weights.positionGain;
      if (redundancy < LEAST_REDUNDANCY) {
        residual[i] = Number.NaN;
        continue;
      }
      let worst = Math.abs(x[i]! - px[i]!) / sx;
      const alongY = Math.abs(y[i]! - py[i]!) / sy;
      if (alongY > worst) worst = alongY;
      if (deep) {
        const alongZ = Math.abs(z[i]! - pz[i]!) / sz;
        if (alongZ > worst) worst = alongZ;
      }
      const own = worst / Math.sqrt(redundancy);
      residual[i] = own;
      if (own > largest) largest = own;
    }
    return largest;
  }

  /**
   * Fits sample i anew without the excluded samples of its window, which widens within reach where fewer would remain
   * than the polynomial has coefficients. Returns one of `REFIT`; only `made` changes anything.
   */
  refit(i: number): number {
    const { frame, low, high, excluded, members, table, count } = this;
    let lo = low[i]!;
    let hi = high[i]!;
    let n = 0;
    for (let j = lo; j <= hi; j++) if (excluded[j] === 0) members[n++] = j;
    if (n === hi - lo + 1) return REFIT.none;
    const needed = this.parameters.order + 1;
    if (n < needed) {
      const first = this.reachFirst[i]!;
      const last = this.reachLast[i]!;
      for (;;) {
        let before = lo - 1;
        while (before >= 0 && excluded[before] !== 0) before--;
        let behind = hi + 1;
        while (behind < count && excluded[behind] !== 0) behind++;
        const left = before >= 0 && frame[before]! >= first ? frame[i]! - frame[before]! : Number.POSITIVE_INFINITY;
        const right = behind < count && frame[behind]! <= last ? frame[behind]! - frame[i]! : Number.POSITIVE_INFINITY;
        if (n >= needed || (left === right && left === Number.POSITIVE_INFINITY)) break;
        if (left <= right) {
          lo = before;
          n++;
        }
        if (right <= left) {
          hi = behind;
          n++;
        }
      }
      if (n < needed) return REFIT.tooFew;
      n = 0;
      for (let j = lo; j <= hi; j++) if (excluded[j] === 0) members[n++] = j;
    }
    const weights = table.at(this.frame, this.time, members, n, i);
    this.applyMembers(i, n, weights);
    return REFIT.made;
  }

  /** Sums over successive samples lo, lo + 1, ...: differences from the sample's own position lose fewer digits. */
  private apply(i: number, lo: number, weights: FitWeights): void {
    const { x, y } = this;
    const { position, velocity, acceleration, count } = weights;
    const x0 = x[i]!;
    const y0 = y[i]!;
    let px = 0;
    let py = 0;
    let vx = 0;
    let vy = 0;
    let ax = 0;
    let ay = 0;
    for (let j = 0; j < count; j++) {
      const dx = x[lo + j]! - x0;
      const dy = y[lo + j]! - y0;
      const wp = position[j]!;
      const wv = velocity[j]!;
      const wa = acceleration[j]!;
      px += wp * dx;
      py += wp * dy;
      vx += wv * dx;
      vy += wv * dy;
      ax += wa * dx;
      ay += wa * dy;
    }
    this.px[i] = x0 + px;
    this.py[i] = y0 + py;
    this.vx[i] = vx;
    this.vy[i] = vy;
    this.ax[i] = ax;
    this.ay[i] = ay;
    if (this.deep) this.applyDepth(i, lo, weights);
    this.positionRoot[i] = weights.positionRoot;
    this.velocityRoot[i] = weights.velocityRoot;
    this.accelerationRoot[i] = weights.accelerationRoot;
  }

  private applyDepth(i: number, lo: number, weights: FitWeights): void {
    const { z } = this;
    const { position, velocity, acceleration, count } = weights;
    const z0 = z[i]!;
    let pz = 0;
    let vz = 0;
    let az = 0;
    for (let j = 0; j < count; j++) {
      const dz = z[lo + j]! - z0;
      pz += position[j]! * dz;
      vz += velocity[j]! * dz;
      az += acceleration[j]! * dz;
    }
    this.pz[i] = z0 + pz;
    this.vz[i] = vz;
    this.az[i] = az;
  }

  /** The same over the first `n` of `members`. */
  private applyMembers(i: number, n: number, weights: FitWeights): void {
    this.sum(i, n, weights, this.x, this.px, this.vx, this.ax);
    this.sum(i, n, weights, this.y, this.py, this.vy, this.ay);
    if (this.deep) this.sum(i, n, weights, this.z, this.pz, this.vz, this.az);
    this.positionRoot[i] = weights.positionRoot;
    this.velocityRoot[i] = weights.velocityRoot;
    this.accelerationRoot[i] = weights.accelerationRoot;
  }

  private sum(
    i: number,
    n: number,
    weights: FitWeights,
    measured: Float64Array,
    position: Float64Array,
    velocity: Float64Array,
    acceleration: Float64Array,
  ): void {
    const { members } = this;
    const base = measured[members[0]!]!;
    let p = 0;
    let v = 0;
    let a = 0;
    for (let j = 0; j < n; j++) {
      const d = measured[members[j]!]! - base;
      p += weights.position[j]! * d;
      v += weights.velocity[j]! * d;
      a += weights.acceleration[j]! * d;
    }
    position[i] = base + p;
    velocity[i] = v;
    acceleration[i] = a;
  }
}
