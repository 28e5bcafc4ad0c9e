import type { Dims, LinkedBlock, SampleBlock } from '../core/columns.js';
import { FLAG } from '../core/columns.js';
import { fitFlags, linkFlag } from '../screening/flags.js';
import { MedianScreen } from '../screening/normalised-median.js';
import { markOffFit } from '../screening/off-fit.js';
import { emitSamples } from './emit-samples.js';
import { EvenFit } from './even-fit.js';
import type { FitParameters } from './fit-parameters.js';
import { fitLag, fitReach } from './fit-parameters.js';
import type { FrameFit } from './frame-fit.js';
import { HeldFrames } from './held-frames.js';
import { MARK } from './marks.js';
import { neighboursInHeld } from './neighbours-in-held.js';
import { PathlineFitter, REFIT } from './pathline-fitter.js';
import { WindowPatterns } from './window-patterns.js';

/** Rows fitted between two looks at messages: about 5 ms. */
const STEP_ROWS = 20_000;

/** Rows worked through at once at least, where they are not more frames than `MOST_REACHES` says: costs little beside them. */
const CHUNK_ROWS = 150_000;
const MOST_REACHES = 4;

/**
 * Fits and screens linked detections as they come, frame by frame, and gives each detection that has a pathline as one
 * sample as soon as nothing that comes later can change it (`fitLag` frames on). What it gives depends on the
 * detections alone, not on how they are cut into blocks.
 *
 * 1. Each sample is fitted over its window of `span` frames.
 * 2. Positions off their fit are marked; fits whose window holds one are made again without it.
 * 3. Velocities are tested against their neighbours (normalised median).
 * 4. Fits whose window holds a sample that failed are made again without it. Flags stay as they are: the round is not
 *    repeated, since each repetition would widen the lag.
 *
 * A screened sample itself is given the value that the rest of its window implies; its measured position is kept
 * beside it. A sample whose fit cannot do without screened ones, because too few others are in reach, carries their
 * flag too: its figures rest on theirs. Each of the four follows the one before at the distance it needs; the frames
 * below are places among the held frames. Memory: `HeldFrames` over lag, reach and one chunk of frames.
 */
export class RollingFit implements FrameFit {
  private readonly parameters: FitParameters;
  private readonly reach: number;
  private readonly half: number;
  private readonly screen: MedianScreen;
  private readonly scratch: Float64Array;
  private readonly even: EvenFit | null;
  private readonly off = new Uint8Array(256);
  private held: HeldFrames | null = null;
  private fitter: PathlineFitter | null = null;
  private candidates = new Uint32Array(0);
  /** Chain of the pathline loaded last, backwards. */
  private chainRow = new Int32Array(256);
  private chainFrame = new Int32Array(256);
  /** Frames before these: fitted; judged against their fit; freed from what is off it; screened; given. */
  private fitted = 0;
  private judged = 0;
  private freed = 0;
  private screened = 0;
  private given = 0;

  constructor(parameters: FitParameters) {
    this.parameters = parameters;
    this.reach = fitReach(parameters);
    this.half = (parameters.span - 1) / 2;
    this.screen = new MedianScreen({
      threshold: parameters.medianThreshold,
      neighbours: parameters.medianNeighbours,
      epsilon: parameters.medianEpsilon,
      noise: parameters.noise,
    });
    this.scratch = new Float64Array(2 * parameters.span);
    this.even = WindowPatterns.serve(parameters) ? new EvenFit(parameters) : null;
  }

  /** Takes the next frames; samples that are finished come out. The block is borrowed. */
  *add(block: LinkedBlock): Generator<SampleBlock | null, void> {
    if (block.number.length === 0) return;
    for (let k = 0; k < block.number.length; k++) {
      const rows = block.offsets[k + 1]! - block.offsets[k]!;
      this.held ??= this.hold(block.dims, rows);
      this.held.append(block, k);
      if (this.enough(this.held)) yield* this.advance(this.held, false);
    }
  }

  /** All that is left, once the last frames were added. */
  *finish(): Generator<SampleBlock | null, void> {
    if (this.held !== null) yield* this.advance(this.held, true);
  }

  private hold(dims: Dims, rows: number): HeldFrames {
    const most = MOST_REACHES * this.reach;
    const chunk = Math.min(most, Math.max(this.fewest, Math.ceil(CHUNK_ROWS / Math.max(1, rows))));
    return new HeldFrames(dims, fitLag(this.parameters) + this.reach + chunk);
  }

  /** Whether there are new frames enough. */
  private enough(held: HeldFrames): boolean {
    const from = this.fitted + this.reach;
    const frames = held.frames - from;
    if (frames < this.fewest) return false;
    if (frames >= MOST_REACHES * this.reach) return true;
    let rows = 0;
    for (let k = from; k < held.frames; k++) rows += held.rows[k]!;
    return rows >= CHUNK_ROWS;
  }

  /** New frames at least: on an uneven clock each chunk costs as many more, looked at on either side, as a fit may reach. */
  private get fewest(): number {
    return this.even === null ? this.reach : 1;
  }

  private *advance(held: HeldFrames, ended: boolean): Generator<SampleBlock | null, void> {
    const { reach, half } = this;
    const all = held.frames;
    if (this.fitter === null || this.fitter.row.length < all) this.widen(all);
    const up = (frame: number, before: number): number => (ended ? all : Math.max(before, frame));
    const fitted = up(all - reach, this.fitted);
    const judged = up(fitted - half, this.judged);
    const freed = up(judged - reach, this.freed);
    const screened = up(freed - 1, this.screened);
    const given = up(screened - reach, this.given);
    if (this.even === null) yield* this.fitNew(held, this.fitted, fitted);
    else yield* this.fitEven(held, this.even, this.fitted, fitted);
    this.judge(held, this.judged, judged);
    yield* this.fitWithout(held, MARK.offFit, MARK.offFit, this.freed, freed);
    yield* this.screenFrames(held, this.screened, screened);
    yield* this.fitWithout(held, MARK.offNeighbours, MARK.offFit | MARK.offNeighbours, this.given, given);
    yield* emitSamples(held, this.parameters, this.given, given);
    const drop = Math.max(0, given - reach);
    held.drop(drop);
    this.fitted = fitted - drop;
    this.judged = judged - drop;
    this.freed = freed - drop;
    this.screened = screened - drop;
    this.given = given - drop;
  }

  private widen(frames: number): void {
    const longest = Math.ceil(1.25 * frames) + 8;
    const deep = this.held!.dims === 3;
    this.fitter = new PathlineFitter(this.parameters, deep, longest);
    this.chainRow = new Int32Array(longest);
    this.chainFrame = new Int32Array(longest);
  }

  /** Fits the samples of frames `from .. to - 1` for the first time. */
  private *fitNew(held: HeldFrames, from: number, to: number): Generator<null, void> {
    const fitter = this.fitter!;
    const { offFitLimit } = this.parameters;
    let done = 0;
    for (let k = from; k < held.frames; k++) {
      const { pathline, after } = held.columns;
      const end = held.start[k]! + held.rows[k]!;
      for (let row = held.start[k]!; row < end; row++) {
        // Each pathline once, at its last sample.
        if (pathline[row]! < 0 || after[row]! >= 0) continue;
        this.load(held, k, row, from - this.reach, 0);
        const first = this.firstFrom(from);
        const last = this.firstFrom(to);
        if (first === last) continue;
        fitter.place(first, last);
        const suspicious = fitter.fit(first, last) > offFitLimit;
        this.keepFits(held, first, last);
        if (suspicious) this.suspect(held, first, last);
        done += last - first;
        if (done > STEP_ROWS) {
          done = 0;
          yield null;
        }
      }
    }
  }

  /** The same where the clock is even. */
  private *fitEven(held: HeldFrames, even: EvenFit, from: number, to: number): Generator<null, void> {
    let done = 0;
    for (let k = from; k < to; k++) {
      even.fitFrame(held, k);
      done += held.rows[k]!;
      if (done > STEP_ROWS) {
        done = 0;
        yield null;
      }
    }
  }

  /** Loads the samples before and up to `row` of frame `k`, back to frame `from`; excludes those with one of `bits`. */
  private load(held: HeldFrames, k: number, row: number, from: number, bits: number): void {
    const fitter = this.fitter!;
    const { chainRow, chainFrame } = this;
    const { before, marks, x, y, z } = held.columns;
    const least = Math.max(0, from);
    let n = 0;
    for (let at = k, r = row; ; ) {
      chainRow[n] = r;
      chainFrame[n++] = at;
      const entry = before[r]!;
      if (entry < 0) break;
      at = held.frameBefore(at, entry);
      if (at < least) break;
      r = held.rowIn(at, entry);
    }
    fitter.count = n;
    for (let i = 0; i < n; i++) {
      const r = chainRow[n - 1 - i]!;
      const at = chainFrame[n - 1 - i]!;
      fitter.row[i] = r;
      fitter.index[i] = at;
      fitter.frame[i] = held.number[at]!;
      fitter.time[i] = held.time[at]!;
      fitter.x[i] = x[r]!;
      fitter.y[i] = y[r]!;
      if (fitter.deep) fitter.z[i] = z[r]!;
      fitter.excluded[i] = (marks[r]! & bits) === 0 ? 0 : 1;
    }
  }

  /** The same around a sample: back to frame `from`, forward to frame `to - 1`. */
  private loadAround(held: HeldFrames, k: number, row: number, from: number, to: number, bits: number): void {
    const { after } = held.columns;
    let at = k;
    let r = row;
    for (let entry = after[r]!; entry >= 0; entry = after[r]!) {
      const next = held.frameAfter(at, entry);
      if (next >= to) break;
      at = next;
      r = held.rowIn(at, entry);
    }
    this.load(held, at, r, from, bits);
  }

  private keepFits(held: HeldFrames, from: number, to: number): void {
    const fitter = this.fitter!;
    const { frame, low, high, count } = fitter;
    const { linkRisk, marks, flags } = held.columns;
    const { half, parameters } = this;
    for (let i = from; i < to; i++) {
      const row = fitter.row[i]!;
      this.keepFit(held, i);
      let mark = 0;
      if (Number.isFinite(fitter.vx[i]!)) mark |= MARK.hasVelocity;
      if (i + 1 < count && frame[i + 1]! - frame[i]! === 1) mark |= MARK.inNextFrame;
      if (i > 0 && frame[i]! - frame[i - 1]! <= 2) mark |= MARK.inTwoFramesBefore;
      marks[row] = mark;
      const lo = low[i]!;
      const hi = high[i]!;
      const first = fitter.reachFirst[i]!;
      const last = fitter.reachLast[i]!;
      const next = i + 1 < count ? linkRisk[fitter.row[i + 1]!]! : 0;
      flags[row] =
        fitFlags(first, last, frame[i]!, half, frame[lo]!, frame[hi]!, i - lo, hi - i) |
        linkFlag(linkRisk[row]!, next, parameters.riskLimit);
    }
  }

  private keepFit(held: HeldFrames, i: number): void {
    const fitter = this.fitter!;
    const row = fitter.row[i]!;
    const { columns } = held;
    columns.px[row] = fitter.px[i]!;
    columns.py[row] = fitter.py[i]!;
    columns.u[row] = fitter.vx[i]!;
    columns.v[row] = fitter.vy[i]!;
    columns.ax[row] = fitter.ax[i]!;
    columns.ay[row] = fitter.ay[i]!;
    columns.positionRoot[row] = fitter.positionRoot[i]!;
    columns.velocityRoot[row] = fitter.velocityRoot[i]!;
    columns.accelerationRoot[row] = fitter.accelerationRoot[i]!;
    if (!fitter.deep) return;
    columns.pz[row] = fitter.pz[i]!;
    columns.w[row] = fitter.vz[i]!;
    columns.az[row] = fitter.az[i]!;
  }

  private suspect(held: HeldFrames, from: number, to: number): void {
    const fitter = this.fitter!;
    const { marks } = held.columns;
    for (let i = from; i < to; i++) {
      if (!(fitter.residual[i]! > this.parameters.offFitLimit)) continue;
      const row = fitter.row[i]!;
      marks[row] = marks[row]! | MARK.suspect;
    }
  }

  /** Decides which suspects of frames `from .. to - 1` are off their fit, by the residuals half a span around. */
  private judge(held: HeldFrames, from: number, to: number): void {
    const { half, reach, off } = this;
    const fitter = this.fitter!;
    const { marks } = held.columns;
    for (let k = from; k < to; k++) {
      const end = held.start[k]! + held.rows[k]!;
      for (let row = held.start[k]!; row < end; row++) {
        if ((marks[row]! & MARK.suspect) === 0) continue;
        this.loadAround(held, k, row, k - half - reach, k + half + reach + 1, 0);
        const first = this.firstFrom(k - half);
        const last = this.firstFrom(k + half + 1);
        const own = this.firstFrom(k) - first;
        fitter.place(first, last);
        fitter.fit(first, last);
        const residual = fitter.residual.subarray(first, last);
        const frame = fitter.frame.subarray(first, last);
        off[own] = 0;
        const limit = this.parameters.offFitLimit;
        markOffFit(residual, frame, last - first, own, own + 1, half, limit, off, this.scratch);
        if (off[own] === 1) marks[row] = marks[row]! | MARK.offFit;
      }
    }
  }

  /** Fits samples of frames `from .. to - 1` anew that have one with `bit` in reach, without all that have one of `bits`. */
  private *fitWithout(held: HeldFrames, bit: number, bits: number, from: number, to: number): Generator<null, void> {
    if (from === to) return;
    const { reach } = this;
    const { marks } = held.columns;
    let done = 0;
    for (let k = Math.max(0, from - reach); k < Math.min(held.frames, to + reach); k++) {
      const end = held.start[k]! + held.rows[k]!;
      for (let row = held.start[k]!; row < end; row++) {
        if ((marks[row]! & bit) === 0) continue;
        this.loadAround(held, k, row, from - reach, to + reach, bits);
        done += this.refit(held, row, bit, from, to);
        if (done > STEP_ROWS) {
          done = 0;
          yield null;
        }
      }
    }
  }

  /** Refits the loaded pathline, unless another of its samples before `row` has brought that about; returns how many it looked at. */
  private refit(held: HeldFrames, row: number, bit: number, from: number, to: number): number {
    const fitter = this.fitter!;
    const { marks, flags } = held.columns;
    const { frame, count } = fitter;
    for (let i = 0; fitter.row[i] !== row; i++) if ((marks[fitter.row[i]!]! & bit) !== 0) return 1;
    const first = this.firstFrom(from);
    const last = this.firstFrom(to);
    if (first === last) return 1;
    fitter.place(first, last);
    let near = 0;
    for (let i = first; i < last; i++) {
      while (near < count && (frame[i]! - frame[near]! > this.reach || (marks[fitter.row[near]!]! & bit) === 0)) near++;
      if (near === count || frame[near]! - frame[i]! > this.reach) continue;
      const done = fitter.refit(i);
      const own = fitter.row[i]!;
      if (done === REFIT.made) {
        this.keepFit(held, i);
        if (Number.isFinite(fitter.vx[i]!)) marks[own] = marks[own]! | MARK.hasVelocity;
      } else if (done === REFIT.tooFew) {
        if (bit === MARK.offFit) marks[own] = marks[own]! | MARK.restsOnOff;
        else flags[own] = flags[own]! | FLAG['off-neighbours'];
      }
    }
    return count;
  }

  /** Tests the velocities of frames `from .. to - 1`. */
  private *screenFrames(held: HeldFrames, from: number, to: number): Generator<null, void> {
    const { x, y, z, u, v, w, velocityRoot, marks } = held.columns;
    const columns = { dims: held.dims, x, y, z, u, v, w, root: velocityRoot };
    let done = 0;
    for (let k = from; k < to; k++) {
      const most = held.rows[k]! + (k > 0 ? held.rows[k - 1]! : 0) + (k + 1 < held.frames ? held.rows[k + 1]! : 0);
      if (this.candidates.length < most) this.candidates = new Uint32Array(Math.ceil(1.25 * most));
      const { judged, count } = neighboursInHeld(held, k, this.candidates);
      this.screen.judge(columns, this.candidates, count, judged, marks, MARK.offNeighbours);
      done += judged;
      if (done > STEP_ROWS) {
        done = 0;
        yield null;
      }
    }
  }

  /** First loaded sample at held frame `k` or later. */
  private firstFrom(k: number): number {
    const { index, count } = this.fitter!;
    let low = 0;
    let high = count;
    while (low < high) {
      const middle = (low + high) >>> 1;
      if (index[middle]! < k) low = middle + 1;
      else high = middle;
    }
    return low;
  }
}
