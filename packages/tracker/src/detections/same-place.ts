/** Odd multiplier near 2^32 over the golden ratio: Fibonacci hashing (Knuth, TAOCP 3, section 6.4). */
const GOLDEN = 0x9e3779b1;

/**
 * Finds rows of one frame that lie at exactly the place of an earlier row (coordinates hold no -0, see judgeRows). Keeps its table
 * between frames. Memory: 8 to 16 bytes a row of the largest frame. Cost: about 10 ns a row.
 */
export class SamePlace {
  /** Row + 1 in each slot, 0 for a free one; always a power of two long and at most half full. */
  #slots = new Int32Array(64);

  /**
   * Calls `found(i)` in ascending order for each row `from <= i < to` that stands where an earlier row of the range
   * stands. `z` is empty in the plane.
   */
  search(
    x: Float64Array,
    y: Float64Array,
    z: Float64Array,
    from: number,
    to: number,
    found: (row: number) => void,
  ): void {
    let size = this.#slots.length;
    while (size < 2 * (to - from)) size *= 2;
    if (size > this.#slots.length) this.#slots = new Int32Array(size);
    // A small frame after a large one clears and uses only the part it needs.
    let used = 64;
    while (used < 2 * (to - from)) used *= 2;
    const slots = this.#slots;
    slots.fill(0, 0, used);
    const mask = used - 1;
    const solid = z.length > 0;
    // Two 32-bit halves a coordinate; which half stands first depends on the machine and does not matter.
    const xBits = halves(x, from, to);
    const yBits = halves(y, from, to);
    const zBits = solid ? halves(z, from, to) : xBits;
    for (let i = from, at = 0; i < to; i++, at += 2) {
      let hash = Math.imul(xBits[at] ^ Math.imul(xBits[at + 1], GOLDEN), GOLDEN) ^ yBits[at];
      hash = Math.imul(hash ^ (hash >>> 15) ^ Math.imul(yBits[at + 1], GOLDEN), GOLDEN);
      if (solid) hash = Math.imul(hash ^ zBits[at] ^ Math.imul(zBits[at + 1], GOLDEN), GOLDEN);
      hash ^= hash >>> 15;
      let slot = hash & mask;
      for (;;) {
        const other = slots[slot] - 1;
        if (other < 0) {
          slots[slot] = i - from + 1;
          break;
        }
        const j = from + other;
        if (x[j] === x[i] && y[j] === y[i] && (!solid || z[j] === z[i])) {
          found(i);
          break;
        }
        slot = (slot + 1) & mask;
      }
    }
  }
}

function halves(values: Float64Array, from: number, to: number): Int32Array {
  return new Int32Array(values.buffer, values.byteOffset + 8 * from, 2 * (to - from));
}
