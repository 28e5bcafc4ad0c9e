import type { LinkedBlock, SampleBlock } from '../core/columns.js';
import { FLAG, NAN, rowCount } from '../core/columns.js';
import { atBody } from '../screening/at-body.js';
import { fitFlags, linkFlag } from '../screening/flags.js';
import { MedianScreen } from '../screening/normalised-median.js';
import { markOffFit } from '../screening/off-fit.js';
import { fitPairs } from './fit-pairs.js';
import type { FitParameters } from './fit-parameters.js';
import { fitReach } from './fit-parameters.js';
import { FitSpace } from './fit-space.js';
import { MARK, neighboursOfFrame } from './neighbours-of-frame.js';
import { PathlineFitter, REFIT } from './pathline-fitter.js';
import { frameOfRows, pathlineOrder } from './pathline-order.js';
import type { CoreRows } from './sample-columns.js';
import { coreRows } from './sample-columns.js';

/** Frame indices `from .. to - 1` of a window whose samples are wanted. */
export interface CoreRange {
  readonly from: number;
  readonly to: number;
}

/** Rows fitted between two looks at messages: about 5 ms. */
const STEP_ROWS = 20_000;

/**
 * Fits and screens a window: the linked detections of frames core.from - lag .. core.to + lag - 1 (fewer at the
 * ends of the run), with lag = `fitLag(parameters)`. Pure; the window is borrowed, the samples are new. Every
 * detection of the core that has a pathline becomes one sample, in the order of rows.
 *
 * 1. Each sample is fitted over its window of `span` frames.
 * 2. Positions off their fit are marked; fits whose window holds one are made again without it.
 * 3. Velocities are tested against their neighbours (normalised median).
 * 4. Fits of the core whose window holds a sample that failed are made again without it. Flags stay as they are:
 *    the round is not repeated, since each repetition would widen the overlap.
 *
 * A screened sample itself is given the value that the rest of its window implies; its measured position is kept
 * beside it. A sample whose fit cannot do without screened ones, because too few others are in reach, carries their
 * flag too: its figures rest on theirs. Cost about 0.6 us a row of the window (span 7, plane, 10 000 rows a frame), half of it the median test.
 * Memory about 60 bytes a row of the window beside it and its samples.
 */
export function fitWindow(window: LinkedBlock, core: CoreRange, parameters: FitParameters): SampleBlock {
  const steps = fitWindowInSteps(window, core, parameters);
  for (;;) {
    const step = steps.next();
    if (step.done) return step.value;
  }
}

/** `fitWindow` in steps of a few ms each, for callers that must look at messages in between; `space` may be kept for the next window. */
export function* fitWindowInSteps(
  window: LinkedBlock,
  core: CoreRange,
  parameters: FitParameters,
  space: FitSpace = new FitSpace(),
): Generator<void, SampleBlock> {
  if (parameters.pairs) return yield* fitPairs(window, core, parameters);
  const work = new WindowWork(window, core, parameters, space);
  yield* work.fitAll();
  if ((yield* work.screen()) > 0) yield* work.fitAgain();
  return work.out.samples;
}

class WindowWork {
  readonly window: LinkedBlock;
  readonly core: CoreRange;
  readonly parameters: FitParameters;
  readonly out: CoreRows;
  private readonly deep: boolean;
  private readonly frameOf: Uint32Array;
  private readonly order: ReturnType<typeof pathlineOrder>;
  private readonly fitter: PathlineFitter;
  private readonly off: Uint8Array;
  private readonly scratch: Float64Array;
  /** By row of the window: velocity, root of its noise gain, marks. */
  private readonly u: Float32Array;
  private readonly v: Float32Array;
  private readonly w: Float32Array;
  private readonly root: Float32Array;
  private readonly marks: Uint8Array;

  constructor(window: LinkedBlock, core: CoreRange, parameters: FitParameters, space: FitSpace) {
    this.window = window;
    this.core = core;
    this.parameters = parameters;
    this.deep = window.dims === 3;
    const rows = rowCount(window);
    this.out = coreRows(window, core.from, core.to);
    this.frameOf = frameOfRows(window, space);
    this.order = pathlineOrder(window, space);
    this.fitter = new PathlineFitter(parameters, this.deep, this.order.longest);
    this.off = new Uint8Array(this.order.longest);
    this.scratch = new Float64Array(2 * parameters.span);
    this.u = space.float32('u', rows);
    this.v = space.float32('v', rows);
    this.w = space.float32('w', this.deep ? rows : 0);
    this.root = space.float32('root', rows);
    this.marks = space.uint8('marks', rows);
  }

  /** First round: fits, marks positions off their fit, fits again without them; writes velocities and the core's samples. */
  *fitAll(): Generator<void, void> {
    const { order, fitter, core, parameters } = this;
    const reach = fitReach(parameters);
    const half = (parameters.span - 1) / 2;
    const far = 2 * reach + 1;
    let done = 0;
    for (let slot = 0; slot < order.count; slot++) {
      const from = order.start[slot]!;
      const to = order.start[slot + 1]!;
      done += to - from;
      if (done > STEP_ROWS) {
        done = 0;
        yield;
      }
      fitter.load(this.window, this.frameOf, order.row, from, to);
      const fitFrom = this.firstFrom(core.from - far - half);
      const fitTo = this.firstFrom(core.to + far + half);
      if (fitFrom === fitTo) continue;
      fitter.place(fitFrom, fitTo);
      const largest = fitter.fit(fitFrom, fitTo);
      const useFrom = this.firstFrom(core.from - reach - 1);
      const useTo = this.firstFrom(core.to + reach + 1);
      if (largest > parameters.offFitLimit) {
        this.leaveOutOffFit(fitFrom, fitTo, this.firstFrom(core.from - far), this.firstFrom(core.to + far));
        for (let i = useFrom; i < useTo; i++) {
          if (fitter.refit(i) !== REFIT.tooFew) continue;
          const row = fitter.row[i]!;
          this.marks[row] = this.marks[row]! | MARK.restsOnOff;
        }
      }
      this.keepVelocities(useFrom, useTo);
      const coreTo = this.firstFrom(core.to);
      for (let i = this.firstFrom(core.from); i < coreTo; i++) this.writeFlags(i, this.writeFit(i));
    }
  }

  /** Marks and excludes samples `from .. to - 1` of the loaded pathline that are off their fit; residuals stand from `fitFrom` on. */
  private leaveOutOffFit(fitFrom: number, fitTo: number, from: number, to: number): void {
    const { fitter, off, marks, parameters } = this;
    markOffFit(
      fitter.residual.subarray(fitFrom, fitTo),
      fitter.frame.subarray(fitFrom, fitTo),
      fitTo - fitFrom,
      from - fitFrom,
      to - fitFrom,
      (parameters.span - 1) / 2,
      parameters.offFitLimit,
      off,
      this.scratch,
    );
    for (let i = from; i < to; i++) {
      if (off[i - fitFrom] === 0) continue;
      off[i - fitFrom] = 0;
      fitter.excluded[i] = 1;
      const row = fitter.row[i]!;
      marks[row] = marks[row]! | MARK.offFit;
    }
  }

  /** Tests the velocities of the core and of all samples that its fits can look at; returns how many fail. */
  *screen(): Generator<void, number> {
    const { parameters, window, core, marks } = this;
    const reach = fitReach(parameters);
    const screen = new MedianScreen({
      threshold: parameters.medianThreshold,
      neighbours: parameters.medianNeighbours,
      epsilon: parameters.medianEpsilon,
      noise: parameters.noise,
    });
    const columns = {
      dims: window.dims,
      x: window.x,
      y: window.y,
      z: window.z,
      u: this.u,
      v: this.v,
      w: this.w,
      root: this.root,
    };
    const candidates = new Uint32Array(mostInThreeFrames(window));
    const last = Math.min(window.number.length, core.to + reach);
    let failed = 0;
    let done = 0;
    for (let k = Math.max(0, core.from - reach); k < last; k++) {
      const { judged, count } = neighboursOfFrame(window, k, marks, candidates);
      failed += screen.judge(columns, candidates, count, judged, marks, MARK.offNeighbours);
      done += judged;
      if (done > STEP_ROWS) {
        done = 0;
        yield;
      }
    }
    const { firstRow, lastRow, sampleOf, samples } = this.out;
    for (let r = firstRow; r < lastRow; r++) {
      if ((marks[r]! & MARK.offNeighbours) === 0) continue;
      const s = sampleOf[r - firstRow]!;
      samples.flags[s] = samples.flags[s]! | FLAG['off-neighbours'];
    }
    return failed;
  }

  /** Second round: fits of the core again where their window holds a sample that failed the test. */
  *fitAgain(): Generator<void, void> {
    const { order, fitter, core, marks, window } = this;
    let done = 0;
    for (let slot = 0; slot < order.count; slot++) {
      const from = order.start[slot]!;
      const to = order.start[slot + 1]!;
      let failed = false;
      for (let at = from; at < to; at++) if ((marks[order.row[at]!]! & MARK.offNeighbours) !== 0) failed = true;
      if (!failed) continue;
      done += to - from;
      if (done > STEP_ROWS) {
        done = 0;
        yield;
      }
      fitter.load(window, this.frameOf, order.row, from, to);
      for (let i = 0; i < fitter.count; i++) {
        if ((marks[fitter.row[i]!]! & (MARK.offFit | MARK.offNeighbours)) !== 0) fitter.excluded[i] = 1;
      }
      const first = this.firstFrom(core.from);
      const last = this.firstFrom(core.to);
      fitter.place(first, last);
      for (let i = first; i < last; i++) {
        const done = fitter.refit(i);
        if (done === REFIT.made) this.writeFit(i);
        if (done !== REFIT.tooFew) continue;
        const s = this.out.sampleOf[fitter.row[i]! - this.out.firstRow]!;
        this.out.samples.flags[s] = this.out.samples.flags[s]! | FLAG['off-neighbours'];
      }
    }
  }

  /** First sample of the loaded pathline at frame index `k` or later. */
  private firstFrom(k: number): number {
    const { index, count } = this.fitter;
    let low = 0;
    let high = count;
    while (low < high) {
      const middle = (low + high) >>> 1;
      if (index[middle]! < k) low = middle + 1;
      else high = middle;
    }
    return low;
  }

  private keepVelocities(from: number, to: number): void {
    const { fitter, u, v, w, root, marks, deep } = this;
    const { frame, count } = fitter;
    for (let i = from; i < to; i++) {
      const row = fitter.row[i]!;
      u[row] = fitter.vx[i]!;
      v[row] = fitter.vy[i]!;
      if (deep) w[row] = fitter.vz[i]!;
      root[row] = fitter.velocityRoot[i]!;
      let mark = marks[row]!;
      if (Number.isFinite(fitter.vx[i]!)) mark |= MARK.hasVelocity;
      if (i + 1 < count && frame[i + 1]! - frame[i]! === 1) mark |= MARK.inNextFrame;
      if (i > 0 && frame[i]! - frame[i - 1]! <= 2) mark |= MARK.inTwoFramesBefore;
      marks[row] = mark;
    }
  }

  /** Writes the fit of loaded sample i into the core's columns; returns its row there. */
  private writeFit(i: number): number {
    const { fitter, deep } = this;
    const { samples, firstRow, sampleOf } = this.out;
    const s = sampleOf[fitter.row[i]! - firstRow]!;
    const [sx, sy, sz] = this.parameters.noise;
    const position = fitter.positionRoot[i]!;
    const velocity = fitter.velocityRoot[i]!;
    const acceleration = fitter.accelerationRoot[i]!;
    samples.x[s] = fitter.px[i]!;
    samples.y[s] = fitter.py[i]!;
    samples.u[s] = oneNaN(fitter.vx[i]!);
    samples.v[s] = oneNaN(fitter.vy[i]!);
    samples.ax[s] = oneNaN(fitter.ax[i]!);
    samples.ay[s] = oneNaN(fitter.ay[i]!);
    samples.xSe[s] = oneNaN(sx * position);
    samples.ySe[s] = oneNaN(sy * position);
    samples.uSe[s] = oneNaN(sx * velocity);
    samples.vSe[s] = oneNaN(sy * velocity);
    samples.axSe[s] = oneNaN(sx * acceleration);
    samples.aySe[s] = oneNaN(sy * acceleration);
    if (deep) {
      samples.z[s] = fitter.pz[i]!;
      samples.w[s] = oneNaN(fitter.vz[i]!);
      samples.az[s] = oneNaN(fitter.az[i]!);
      samples.zSe[s] = oneNaN(sz * position);
      samples.wSe[s] = oneNaN(sz * velocity);
      samples.azSe[s] = oneNaN(sz * acceleration);
    }
    return s;
  }

  private writeFlags(i: number, s: number): void {
    const { fitter, parameters, window } = this;
    const { frame, low, high } = fitter;
    const lo = low[i]!;
    const hi = high[i]!;
    const row = fitter.row[i]!;
    const next = i + 1 < fitter.count ? window.linkRisk[fitter.row[i + 1]!]! : 0;
    const half = (parameters.span - 1) / 2;
    let flags = fitFlags(
      fitter.reachFirst[i]!,
      fitter.reachLast[i]!,
      frame[i]!,
      half,
      frame[lo]!,
      frame[hi]!,
      i - lo,
      hi - i,
    );
    flags |= linkFlag(window.linkRisk[row]!, next, parameters.riskLimit);
    if ((this.marks[row]! & (MARK.offFit | MARK.restsOnOff)) !== 0) flags |= FLAG['off-fit'];
    if (parameters.bodies.length > 0) flags |= atBody(parameters.bodies, parameters.rim, fitter.px[i]!, fitter.py[i]!);
    this.out.samples.flags[s] = flags;
  }
}

/** NaN of any sign or payload becomes the one that results carry. */
function oneNaN(value: number): number {
  return Number.isNaN(value) ? NAN : value;
}

function mostInThreeFrames(window: LinkedBlock): number {
  let most = 0;
  const frames = window.number.length;
  for (let k = 0; k < frames; k++) {
    const n = window.offsets[Math.min(frames, k + 2)]! - window.offsets[Math.max(0, k - 1)]!;
    if (n > most) most = n;
  }
  return most;
}
