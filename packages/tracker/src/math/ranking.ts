/**
 * Ranks of a few values by comparing each with each: no branch depends on data, which makes it two to three times
 * faster than insertion up to about 20 values in no order. Mutable scratch: one a user.
 */
export class Ranking {
  private readonly rank: Int32Array;

  /** `most`: values at most. */
  constructor(most: number) {
    this.rank = new Int32Array(most + 1);
  }

  /**
   * Rank (0-based) of each of `values[0 .. count - 1]`; of equal values the first comes first. No NaN may be among them.
   * `values[count]` is overwritten where the count is odd. Borrowed until the next call.
   */
  of(values: Float64Array, count: number): Int32Array {
    const { rank } = this;
    // Two by two: a pass over those before serves both. A last one without partner is paired with what comes behind all.
    if ((count & 1) === 1) values[count] = Number.POSITIVE_INFINITY;
    for (let i = 0; i < count; i += 2) {
      const a = values[i]!;
      const b = values[i + 1]!;
      let beforeA = 0;
      let beforeB = 0;
      for (let j = 0; j < i; j++) {
        const value = values[j]!;
        const first = Number(value <= a);
        const second = Number(value <= b);
        beforeA = (beforeA + first) | 0;
        beforeB = (beforeB + second) | 0;
        rank[j] = (rank[j]! + 2 - first - second) | 0;
      }
      const inOrder = Number(a <= b);
      rank[i] = (beforeA + 1 - inOrder) | 0;
      rank[i + 1] = (beforeB + inOrder) | 0;
    }
    return rank;
  }
}
