import { SurpriseRecord } from '@wakeloom/tracker/linking/surprise-record';
import { describe, expect, it } from 'vitest';

const FLOOR = 0.01;
const START = 2;
const GUESSES = 3;
const CELLS = 4;

const record = () => new SurpriseRecord(GUESSES, CELLS, FLOOR, START);

function learnAll(one: SurpriseRecord, cell: number, guess: number, squares: readonly number[]): void {
  for (const square of squares) one.learn(cell, guess, square);
}

function all(one: SurpriseRecord): number[] {
  return Array.from({ length: GUESSES * CELLS }, (_, n) => one.of(n % CELLS, Math.floor(n / CELLS)));
}

describe('record of squared surprises', () => {
  it('expects what it was told at the start, at least the floor', () => {
    expect(all(record())).toEqual(new Array(GUESSES * CELLS).fill(START));
    expect(new SurpriseRecord(1, 1, 3, 2).of(0, 0)).toBe(3);
  });

  it('in a cell is the mean with the field counting for twelve, in the field with the start counting for twelve', () => {
    const one = record();
    learnAll(one, 1, 2, [1, 0.5, 3, 1.5]);
    learnAll(one, 3, 2, [4, 6]);
    expect(all(one)).toEqual(new Array(GUESSES * CELLS).fill(START));
    one.fade();
    // Of each sum 0.95 stays: 6 from 4 links in cell 1, 10 from 2 in cell 3, 16 from 6 in the field.
    const field = (0.95 * 16 + 12 * START) / (0.95 * 6 + 12);
    expect(one.of(1, 2)).toBeCloseTo((0.95 * 6 + 12 * field) / (0.95 * 4 + 12), 14);
    expect(one.of(3, 2)).toBeCloseTo((0.95 * 10 + 12 * field) / (0.95 * 2 + 12), 14);
    // Cells that have seen nothing lean on the field, other guesses have learnt nothing.
    for (const cell of [0, 2]) expect(one.of(cell, 2)).toBeCloseTo(field, 14);
    expect(all(one).slice(0, 2 * CELLS)).toEqual(new Array(2 * CELLS).fill(START));
  });

  it('tends to what each cell sees of late', () => {
    const one = record();
    for (let k = 0; k < 200; k++) {
      learnAll(one, 0, 0, new Array(30).fill(5));
      one.fade();
    }
    for (let k = 0; k < 600; k++) {
      learnAll(one, 0, 0, [0.2, 0.4]);
      learnAll(one, 1, 0, [0.8, 1.2, 1]);
      one.fade();
    }
    // 0.95 + 0.95^2 + ... = 19.
    const field = (19 * 3.6 + 12 * START) / (19 * 5 + 12);
    expect(one.of(0, 0)).toBeCloseTo((19 * 0.6 + 12 * field) / (19 * 2 + 12), 9);
    expect(one.of(1, 0)).toBeCloseTo((19 * 3 + 12 * field) / (19 * 3 + 12), 9);
    expect(one.of(3, 0)).toBeCloseTo(field, 9);
  });

  it('is never below the floor', () => {
    const one = record();
    for (let k = 0; k < 600; k++) {
      learnAll(one, 2, 1, new Array(200).fill(1e-6));
      one.fade();
    }
    // Without a floor it would be 12 x 2 / (3800 + 12) in the field, and less in the cell.
    expect(one.of(2, 1)).toBe(FLOOR);
    expect(one.of(0, 1)).toBe(FLOOR);
  });

  it('takes a surprise for at most six times what was expected', () => {
    const one = record();
    one.learn(0, 0, 1e12);
    one.fade();
    const field = (0.95 * 6 * START + 12 * START) / (0.95 + 12);
    expect(one.of(0, 0)).toBeCloseTo((0.95 * 6 * START + 12 * field) / (0.95 + 12), 14);
    expect(one.of(1, 0)).toBeCloseTo(field, 14);
    // What is expected is that of the cell where it happened.
    const here = one.of(0, 0);
    one.learn(0, 0, 1e12);
    one.fade();
    const sum = 0.95 * (0.95 * 6 * START + 6 * here);
    expect(one.of(1, 0)).toBeCloseTo((sum + 12 * START) / (0.95 * 1.95 + 12), 14);
  });

  it('knows a guess from twelve links on, wherever they were, until they are forgotten', () => {
    const one = record();
    for (let n = 0; n < 11; n++) one.learn(n % CELLS, 1, 1);
    expect(one.knows(1)).toBe(false);
    one.learn(0, 1, 1);
    expect([0, 1, 2].map((guess) => one.knows(guess))).toEqual([false, true, false]);
    one.fade();
    expect(one.knows(1)).toBe(false);
    learnAll(one, 0, 1, [1]);
    expect(one.knows(1)).toBe(true);
  });

  it('goes on from its data as the same, and the data are copies', () => {
    const one = record();
    for (let n = 0; n < 60; n++) one.learn(n % CELLS, n % GUESSES, 0.1 * n);
    one.fade();
    // The data are those of closed frames: nothing has been learnt since.
    const data = one.toData();
    const other = record();
    learnAll(other, 0, 0, [9, 9, 9]);
    other.fade();
    other.restore(data);
    const before = all(one);
    expect(all(other)).toEqual(before);
    for (const each of [one, other]) {
      learnAll(each, 2, 0, [0.3, 7, 100]);
      each.fade();
    }
    expect(all(other)).toEqual(all(one));
    expect(all(one)).not.toEqual(before);
    const again = record();
    again.restore(data);
    expect(all(again)).toEqual(before);
    expect([0, 1, 2].map((guess) => again.knows(guess))).toEqual([true, true, true]);
  });
});
