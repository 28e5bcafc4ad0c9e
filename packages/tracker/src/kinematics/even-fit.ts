import { linkFlag } from '../screening/flags.js';
import type { FitParameters } from './fit-parameters.js';
import { fewestInFit, fitReach } from './fit-parameters.js';
import type { HeldFrames } from './held-frames.js';
import { PLACE_BITS, PLACE_MASK } from './held-frames.js';
import { MARK } from './marks.js';
import type { WindowPattern } from './window-patterns.js';
import { WindowPatterns } from './window-patterns.js';

/** Rows looked at together: their windows fit the first-level cache. */
const BATCH = 256;

/**
 * First fits where the clock is even: everything but the positions follows from which frames in reach the pathline was
 * seen in (`WindowPatterns`). Samples seen in every frame of the span, which nearly all are, share one pattern: they
 * are taken in batches, column by column. The same bits as `PathlineFitter` gives. Mutable scratch: one a user.
 */
export class EvenFit {
  private readonly parameters: FitParameters;
  private readonly span: number;
  private readonly half: number;
  private readonly reach: number;
  private readonly patterns: WindowPatterns;
  /** The pattern of a sample with all frames of the span round it; null where such a window is too small. */
  private readonly whole: WindowPattern | null;
  private readonly batch = new Int32Array(BATCH);
  /** Rows of the window of each of the batch, frame by frame. [BATCH span] */
  private readonly rows: Int32Array;
  /** Largest deviation of the measured position over its noise. */
  private readonly deviation = new Float64Array(BATCH);
  /** Rows of the last batch that have another pattern. */
  private readonly others = new Int32Array(BATCH);
  private aside = 0;
  /** Rows of the pathline before and behind the sample at hand, outwards. */
  private readonly back: Int32Array;
  private readonly forth: Int32Array;

  constructor(parameters: FitParameters) {
    const { span } = parameters;
    this.parameters = parameters;
    this.span = span;
    this.half = (span - 1) / 2;
    this.reach = fitReach(parameters);
    this.patterns = new WindowPatterns(parameters);
    const side = 2 ** this.half - 1;
    this.whole = fewestInFit(parameters) <= span ? this.patterns.of(side, side) : null;
    this.rows = new Int32Array(BATCH * Math.max(span, 2 * this.reach + 1));
    this.back = new Int32Array(this.reach);
    this.forth = new Int32Array(this.reach);
  }

  /** Fits all samples of held frame k. The frames in reach must be held, if there are any. */
  fitFrame(held: HeldFrames, k: number): void {
    const { half, span, whole, others } = this;
    const from = held.start[k]!;
    const to = from + held.rows[k]!;
    const inside = k >= half && k + half < held.frames && held.number[k + half]! - held.number[k - half]! === span - 1;
    for (let first = from; first < to; first += BATCH) {
      const last = Math.min(to, first + BATCH);
      let aside = 0;
      if (whole !== null && inside) {
        const linked = this.follow(held, k, first, last);
        aside = this.aside;
        this.fit(held, whole, linked);
      } else {
        const { pathline } = held.columns;
        for (let row = first; row < last; row++) if (pathline[row]! >= 0) others[aside++] = row;
      }
      for (let i = 0; i < aside; i++) this.fitOther(held, k, others[i]!);
    }
  }

  /** Finds the windows of rows `first .. last - 1`: those with every frame of the span go into the batch, the rest into `others`. */
  private follow(held: HeldFrames, k: number, first: number, last: number): number {
    const { pathline, before, after } = held.columns;
    const { batch, rows, half, span, others } = this;
    const { start } = held;
    let count = 0;
    let aside = 0;
    for (let row = first; row < last; row++) {
      if (pathline[row]! < 0) continue;
      const base = count * span + half;
      let steps = 1;
      let r = row;
      for (; steps <= half; steps++) {
        const entry = before[r]!;
        if (entry >>> PLACE_BITS !== 1) break;
        r = start[k - steps]! + (entry & PLACE_MASK);
        rows[base - steps] = r;
      }
      if (steps > half) {
        r = row;
        for (steps = 1; steps <= half; steps++) {
          const entry = after[r]!;
          if (entry >>> PLACE_BITS !== 1) break;
          r = start[k + steps]! + (entry & PLACE_MASK);
          rows[base + steps] = r;
        }
      } else steps = 0;
      if (steps > half) {
        rows[base] = row;
        batch[count++] = row;
      } else others[aside++] = row;
    }
    this.aside = aside;
    return count;
  }

  /** Fits one sample of any pattern. */
  private fitOther(held: HeldFrames, k: number, row: number): void {
    const { before, after } = held.columns;
    const { number, start, frames } = held;
    const { back, forth, reach, rows, batch } = this;
    const own = number[k]!;
    let maskBefore = 0;
    let n = 0;
    for (let at = k, r = row; ; ) {
      const entry = before[r]!;
      if (entry < 0) break;
      at -= entry >>> PLACE_BITS;
      if (at < 0 || own - number[at]! > reach) break;
      r = start[at]! + (entry & PLACE_MASK);
      back[n++] = r;
      maskBefore |= 1 << (own - number[at]! - 1);
    }
    let maskBehind = 0;
    n = 0;
    for (let at = k, r = row; ; ) {
      const entry = after[r]!;
      if (entry < 0) break;
      at += entry >>> PLACE_BITS;
      if (at >= frames || number[at]! - own > reach) break;
      r = start[at]! + (entry & PLACE_MASK);
      forth[n++] = r;
      maskBehind |= 1 << (number[at]! - own - 1);
    }
    const pattern = this.patterns.of(maskBefore, maskBehind);
    for (let j = 0; j < pattern.before; j++) rows[pattern.before - 1 - j] = back[j]!;
    rows[pattern.before] = row;
    for (let j = 0; j < pattern.behind; j++) rows[pattern.before + 1 + j] = forth[j]!;
    batch[0] = row;
    this.fit(held, pattern, 1, n > 0 ? forth[0]! : -1);
  }

  /** Fits the first `count` of the batch; `next`: the sample after the only one of a batch, where the window may not hold it. */
  private fit(held: HeldFrames, pattern: WindowPattern, count: number, next = -1): void {
    this.fitPlane(held, pattern, count);
    if (held.dims === 3) this.fitDepth(held, pattern, count);
    this.keep(held, pattern, count, next);
  }

  /** Along x and y: differences from the sample's own position lose fewer digits; sums in the order of frames. */
  private fitPlane(held: HeldFrames, pattern: WindowPattern, count: number): void {
    const { columns } = held;
    const { x, y, u, v } = columns;
    const { weights, before } = pattern;
    const { rows, deviation } = this;
    const size = before + 1 + pattern.behind;
    const [sx, sy] = this.parameters.noise;
    for (let i = 0; i < count; i++) {
      const own = rows[i * size + before]!;
      const x0 = x[own]!;
      const y0 = y[own]!;
      let px = 0;
      let py = 0;
      let vx = 0;
      let vy = 0;
      let ax = 0;
      let ay = 0;
      for (let j = 0; j < size; j++) {
        const row = rows[i * size + j]!;
        const dx = x[row]! - x0;
        const dy = y[row]! - y0;
        const wp = weights[3 * j]!;
        const wv = weights[3 * j + 1]!;
        const wa = weights[3 * j + 2]!;
        px += wp * dx;
        py += wp * dy;
        vx += wv * dx;
        vy += wv * dy;
        ax += wa * dx;
        ay += wa * dy;
      }
      px += x0;
      py += y0;
      u[own] = vx;
      v[own] = vy;
      columns.px[own] = px;
      columns.py[own] = py;
      columns.ax[own] = ax;
      columns.ay[own] = ay;
      const alongX = Math.abs(x0 - px) / sx;
      const alongY = Math.abs(y0 - py) / sy;
      deviation[i] = Math.max(alongX, alongY);
    }
  }

  private fitDepth(held: HeldFrames, pattern: WindowPattern, count: number): void {
    const { z, pz, w, az } = held.columns;
    const { weights, before } = pattern;
    const { rows, deviation } = this;
    const size = before + 1 + pattern.behind;
    const sz = this.parameters.noise[2];
    for (let i = 0; i < count; i++) {
      const own = rows[i * size + before]!;
      const z0 = z[own]!;
      let p = 0;
      let velocity = 0;
      let acceleration = 0;
      for (let j = 0; j < size; j++) {
        const dz = z[rows[i * size + j]!]! - z0;
        p += weights[3 * j]! * dz;
        velocity += weights[3 * j + 1]! * dz;
        acceleration += weights[3 * j + 2]! * dz;
      }
      p += z0;
      pz[own] = p;
      w[own] = velocity;
      az[own] = acceleration;
      const alongZ = Math.abs(z0 - p) / sz;
      if (alongZ > deviation[i]!) deviation[i] = alongZ;
    }
  }

  /** Roots of the gains, marks and flags of the batch. */
  private keep(held: HeldFrames, pattern: WindowPattern, count: number, next: number): void {
    const { marks, flags, linkRisk, positionRoot, velocityRoot, accelerationRoot, u } = held.columns;
    const { batch, rows, deviation } = this;
    const { before, redundancy } = pattern;
    const size = before + 1 + pattern.behind;
    const { offFitLimit, riskLimit } = this.parameters;
    for (let i = 0; i < count; i++) {
      const row = batch[i]!;
      positionRoot[row] = pattern.positionRoot;
      velocityRoot[row] = pattern.velocityRoot;
      accelerationRoot[row] = pattern.accelerationRoot;
      let mark = pattern.marks;
      if (Number.isFinite(u[row]!)) mark |= MARK.hasVelocity;
      if (redundancy > 0 && deviation[i]! / redundancy > offFitLimit) mark |= MARK.suspect;
      marks[row] = mark;
      const behind = pattern.behind > 0 ? rows[i * size + before + 1]! : next;
      flags[row] = pattern.flags | linkFlag(linkRisk[row]!, behind < 0 ? 0 : linkRisk[behind]!, riskLimit);
    }
  }
}
