/** Share kept from frame to frame: a memory of about 20 frames. */
const KEEP = 0.95;
/** Links that the whole field's record counts for in a cell's, and what is assumed at the start in the whole field's. */
const PRIOR = 12;
/** A surprise enters with at most this many times what was expected: single wrong links must not swing it. */
const MOST = 6;

/**
 * Mean squared surprise of each way of guessing, in each cell of the flow picture, told from the links made of late.
 * A cell that has seen little leans on the whole field.
 */
export class SurpriseRecord {
  private readonly sum: Float64Array[];
  private readonly weight: Float64Array[];
  private readonly wholeSum: Float64Array;
  private readonly wholeWeight: Float64Array;
  private readonly cells: number;
  private readonly expected: Float64Array;
  private readonly floor: number;
  private readonly start: number;

  /** `floor`: least expected square (position noise), `start`: expected square before anything is known. */
  constructor(guesses: number, cells: number, floor: number, start: number) {
    this.sum = Array.from({ length: guesses }, () => new Float64Array(cells));
    this.weight = Array.from({ length: guesses }, () => new Float64Array(cells));
    this.wholeSum = new Float64Array(guesses);
    this.wholeWeight = new Float64Array(guesses);
    this.floor = floor;
    this.start = start;
    this.cells = cells;
    this.expected = new Float64Array(guesses * cells);
    this.tabulate();
  }

  /** Expected square of a guess in a cell, length unit squared of link space, as of the last frame closed. */
  of(cell: number, guess: number): number {
    return this.expected[guess * this.cells + cell];
  }

  /** True once a guess was seen often enough to be judged. */
  knows(guess: number): boolean {
    return this.wholeWeight[guess] >= PRIOR;
  }

  learn(cell: number, guess: number, square: number): void {
    const counted = Math.min(square, MOST * this.of(cell, guess));
    this.sum[guess][cell] += counted;
    this.weight[guess][cell]++;
    this.wholeSum[guess] += counted;
    this.wholeWeight[guess]++;
  }

  /** Closes a frame: forgets a share, and what was learnt begins to show. */
  fade(): void {
    for (const part of this.parts()) for (let n = 0; n < part.length; n++) part[n] *= KEEP;
    this.tabulate();
  }

  private tabulate(): void {
    const { expected, cells, floor, start } = this;
    for (const [guess, sum] of this.sum.entries()) {
      const weight = this.weight[guess];
      const whole = (this.wholeSum[guess] + PRIOR * start) / (this.wholeWeight[guess] + PRIOR);
      const first = guess * cells;
      for (let cell = 0; cell < cells; cell++) {
        const square = (sum[cell] + PRIOR * whole) / (weight[cell] + PRIOR);
        expected[first + cell] = Math.max(square, floor);
      }
    }
  }

  /** Copies in plain form. */
  toData(): Float64Array[] {
    return this.parts().map((part) => part.slice());
  }

  /** Takes copies from a record of the same guesses and cells. */
  restore(data: readonly Float64Array[]): void {
    for (const [n, part] of this.parts().entries()) part.set(data[n]);
    this.tabulate();
  }

  private parts(): Float64Array[] {
    return [...this.sum, ...this.weight, this.wholeSum, this.wholeWeight];
  }
}
