import { FitWeights, localWeights } from './local-fit.js';

/** Longest reach in frames whose pattern of present and missing frames fits a key of 31 bits. */
const PATTERN_FRAMES = 31;

/** Patterns kept at most; beyond it they are forgotten and made anew (same bits, so nothing depends on it). */
const MOST_PATTERNS = 4096;

/**
 * Weights of local fits, remembered by pattern. With an even clock they depend only on which frames take part and
 * which of them is asked for, so that every weight is made once by `localWeights` from whole-number offsets and
 * looked up afterwards; a remembered weight and a new one are the same bits. With uneven times each fit has weights
 * of its own. Mutable: one table a user. Patterns without a gap cost one array access.
 */
export class WeightTable {
  private readonly most: number;
  private readonly order: number;
  private readonly interval: number | null;
  private readonly whole: (FitWeights | undefined)[];
  private readonly patterns = new Map<number, FitWeights>();
  private readonly offsets: Float64Array;
  private readonly scratch: Float64Array;
  private readonly passing: FitWeights;

  /** `most`: samples in a fit at most. `interval`: time from frame to frame of an even clock, null for uneven times. */
  constructor(most: number, order: number, interval: number | null) {
    this.most = most;
    this.order = order;
    this.interval = interval;
    this.whole = new Array<FitWeights | undefined>((most + 1) * most);
    this.offsets = new Float64Array(most);
    this.scratch = new Float64Array(2 * most);
    this.passing = new FitWeights(most);
  }

  /** True where `gapless` may be used. */
  get even(): boolean {
    return this.interval !== null;
  }

  /** Weights over `count` successive frames at the one numbered `at` (0-based). Even clock only. */
  gapless(count: number, at: number): FitWeights {
    const key = count * this.most + at;
    const known = this.whole[key];
    if (known !== undefined) return known;
    for (let j = 0; j < count; j++) this.offsets[j] = j - at;
    const made = new FitWeights(count);
    localWeights(this.offsets, count, this.order, this.interval!, made, this.scratch);
    this.whole[key] = made;
    return made;
  }

  /**
   * Weights over the samples `members[0 .. count - 1]` (ascending) of a pathline with frame numbers `frame` and
   * times `time`, at sample `at`, which need not be among them. Borrowed until the next call.
   */
  at(frame: Int32Array, time: Float64Array, members: Int32Array, count: number, at: number): FitWeights {
    const first = members[0]!;
    const last = members[count - 1]!;
    const { offsets, scratch, order, interval } = this;
    if (interval === null) {
      const unit = count > 1 ? (time[last]! - time[first]!) / (count - 1) : 1;
      for (let j = 0; j < count; j++) offsets[j] = (time[members[j]!]! - time[at]!) / unit;
      localWeights(offsets, count, order, unit, this.passing, scratch);
      return this.passing;
    }
    const start = frame[first]!;
    const place = frame[at]! - start;
    if (frame[last]! - start === count - 1 && place >= 0 && place < count) return this.gapless(count, place);
    for (let j = 0; j < count; j++) offsets[j] = frame[members[j]!]! - frame[at]!;
    if (frame[last]! - start >= PATTERN_FRAMES || place < -PATTERN_FRAMES || place > PATTERN_FRAMES) {
      localWeights(offsets, count, order, interval, this.passing, scratch);
      return this.passing;
    }
    let mask = 0;
    for (let j = 0; j < count; j++) mask |= 1 << (frame[members[j]!]! - start);
    // `place` lies within 31 frames before or behind `start`: 6 bits.
    const key = (mask >>> 0) * 64 + (place + PATTERN_FRAMES);
    const known = this.patterns.get(key);
    if (known !== undefined) return known;
    const made = new FitWeights(count);
    localWeights(offsets, count, order, interval, made, scratch);
    if (this.patterns.size >= MOST_PATTERNS) this.patterns.clear();
    this.patterns.set(key, made);
    return made;
  }
}
