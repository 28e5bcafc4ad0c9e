/** Share of the record kept from frame to frame: a memory of about 20 frames. */
const KEEP = 0.95;
/** Bounds of a probability that is told from shares. */
const LEAST = 0.02;
const MOST = 0.995;
/** Pathlines of one detection, of more that were seen in the last frame, and such that missed frames; what is assumed before any was seen. */
const ASSUMED = [0.6, 0.9, 0.5] as const;

/**
 * How probable it is that a pathline's particle is detected in the next frame, told from the shares that were linked of
 * late: a single detection may be a false one, a particle that missed a frame may have left the light sheet.
 */
export class Presence {
  private readonly linked = new Float64Array(ASSUMED.length);
  private readonly all = new Float64Array(ASSUMED.length);
  private readonly probability = Float64Array.from(ASSUMED);

  /** Probability for a pathline of `age` detections that missed `missed` frames since the last. */
  of(age: number, missed: number): number {
    return this.probability[kindOf(age, missed)];
  }

  count(age: number, missed: number, linked: boolean): void {
    const kind = kindOf(age, missed);
    this.all[kind]++;
    if (linked) this.linked[kind]++;
  }

  /** Closes a frame. */
  fade(): void {
    for (const [kind, assumed] of ASSUMED.entries()) {
      this.linked[kind] *= KEEP;
      this.all[kind] *= KEEP;
      // A few imagined cases keep the shares of small fields quiet.
      const share = (this.linked[kind] + 10 * assumed) / (this.all[kind] + 10);
      this.probability[kind] = share < LEAST ? LEAST : Math.min(share, MOST);
    }
  }

  toData(): Float64Array {
    return Float64Array.of(...this.linked, ...this.all, ...this.probability);
  }

  restore(data: Float64Array): void {
    const kinds = ASSUMED.length;
    this.linked.set(data.subarray(0, kinds));
    this.all.set(data.subarray(kinds, 2 * kinds));
    this.probability.set(data.subarray(2 * kinds, 3 * kinds));
  }
}

function kindOf(age: number, missed: number): number {
  return missed > 0 ? 2 : age < 2 ? 0 : 1;
}
