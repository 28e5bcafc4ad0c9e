/** Share kept from frame to frame: a memory of about 20 frames. */
const KEEP = 0.95;
/** Links that the whole field's record counts for in a cell's, and what is assumed at the start in the whole field's. */
const PRIOR = 12;
/** A surprise enters with at most this many times what was expected: single wrong links must not swing it. */
const MOST = 6;

/**
 * Mean squared surprise of each way of guessing, in each cell of the flow picture, told from the links made of late.
 * A cell that has seen little leans on the whole field. What is learnt shows once the frame is closed.
 */
export class SurpriseRecord {
  /** Sums of counted squares and of links, [guess * cells + cell]; and of the whole field, [guess]. */
  private readonly sum: Float64Array;
  private readonly weight: Float64Array;
  private readonly wholeSum: Float64Array;
  private readonly wholeWeight: Float64Array;
  private readonly expected: Float64Array;
  private readonly guesses: number;
  private readonly cells: number;
  private readonly floor: number;
  private readonly start: number;

  /** `floor`: least expected square (position noise), `start`: expected square before anything is known. */
  constructor(guesses: number, cells: number, floor: number, start: number) {
    this.sum = new Float64Array(guesses * cells);
    this.weight = new Float64Array(guesses * cells);
    this.wholeSum = new Float64Array(guesses);
    this.wholeWeight = new Float64Array(guesses);
    this.expected = new Float64Array(guesses * cells);
    this.guesses = guesses;
    this.cells = cells;
    this.floor = floor;
    this.start = start;
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
    const at = guess * this.cells + cell;
    const most = MOST * this.expected[at];
    const counted = Math.min(square, most);
    this.sum[at] += counted;
    this.weight[at]++;
    this.wholeSum[guess] += counted;
    this.wholeWeight[guess]++;
  }

  /** Closes a frame: forgets a share, and what was learnt begins to show. */
  fade(): void {
    for (const part of this.parts()) for (let n = 0; n < part.length; n++) part[n] *= KEEP;
    this.tabulate();
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

  private tabulate(): void {
    const { expected, sum, weight, cells, floor, start } = this;
    for (let guess = 0; guess < this.guesses; guess++) {
      const whole = (this.wholeSum[guess] + PRIOR * start) / (this.wholeWeight[guess] + PRIOR);
      for (let at = guess * cells; at < (guess + 1) * cells; at++) {
        expected[at] = Math.max((sum[at] + PRIOR * whole) / (weight[at] + PRIOR), floor);
      }
    }
  }

  private parts(): Float64Array[] {
    return [this.sum, this.weight, this.wholeSum, this.wholeWeight];
  }
}
