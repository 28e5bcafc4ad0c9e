/** Share of the record kept from frame to frame: a memory of about 20 frames. */
const KEEP = 0.95;
/** A surprise counts at most this many times what was expected. */
const MOST = 8;
/** Imagined surprises of just the expected size, so that few real ones do not swing the scale. */
const IMAGINED = 20;

/** How a prediction was made: what its expected square has to be scaled by is measured for each kind by itself. */
export const KINDS = 8;

/**
 * Scale of expected squares: mean of squared surprise over expected square of the links made of late, for each kind of
 * prediction. With it the expected squares are right on the whole, whatever the rules that they come from leave out.
 */
export class SurpriseScale {
  private readonly sum = new Float64Array(KINDS);
  private readonly weight = new Float64Array(KINDS);
  private readonly scale = new Float64Array(KINDS).fill(1);

  of(kind: number): number {
    return this.scale[kind];
  }

  /** Counts a link whose squared surprise was `ratio` times the expected square before scaling. */
  count(kind: number, ratio: number): void {
    const most = MOST * this.scale[kind];
    this.sum[kind] += Math.min(ratio, most);
    this.weight[kind]++;
  }

  /** Closes a frame. */
  fade(): void {
    for (let kind = 0; kind < KINDS; kind++) {
      this.sum[kind] *= KEEP;
      this.weight[kind] *= KEEP;
      this.scale[kind] = (this.sum[kind] + IMAGINED) / (this.weight[kind] + IMAGINED);
    }
  }

  toData(): Float64Array {
    return Float64Array.of(...this.sum, ...this.weight, ...this.scale);
  }

  restore(data: Float64Array): void {
    this.sum.set(data.subarray(0, KINDS));
    this.weight.set(data.subarray(KINDS, 2 * KINDS));
    this.scale.set(data.subarray(2 * KINDS, 3 * KINDS));
  }
}
