import { Candidates } from '@wakeloom/tracker/linking/candidates';
import { decay, linkRisk, loneRivals } from '@wakeloom/tracker/linking/link-risk';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { describe, expect, it } from 'vitest';

/** Candidates from densities by row and column (0: none), and the assignment that gives each row a column (-1: none). */
function frameOf(density: readonly (readonly number[])[], columnOf: readonly number[]) {
  const columns = density[0].length;
  const candidates = new Candidates();
  candidates.begin(density.length, columns);
  const edgeOfRow = new Int32Array(density.length).fill(-1);
  const rowOfColumn = new Int32Array(columns).fill(-1);
  for (const [row, line] of density.entries()) {
    candidates.reserve(columns);
    for (const [column, value] of line.entries()) {
      if (value === 0) continue;
      if (columnOf[row] === column) {
        edgeOfRow[row] = candidates.edges;
        rowOfColumn[column] = row;
      }
      candidates.column[candidates.edges] = column;
      candidates.density[candidates.edges++] = value;
    }
    candidates.start[row + 1] = candidates.edges;
  }
  const assignment = { edgeOfRow, rowOfColumn };
  const lone = new Float64Array(columns).fill(9);
  loneRivals(candidates, assignment, lone);
  return { lone: [...lone], risk: (row: number, stray: number) => linkRisk(candidates, assignment, row, stray, lone) };
}

/** Risk of a link of density `own` with nothing but strays of density `against` in its place: the calibration alone. */
function calibrated(own: number, against: number): number {
  return frameOf([[own]], [0]).risk(0, against);
}

describe('risk of a link', () => {
  // 2 and 3 for the links, 0.5 and 0.4 crosswise: exchanged 0.5 x 0.4 against 2 x 3, so against the first link alone
  // 0.5 x 0.4 / 3, against the second 0.5 x 0.4 / 2.
  it('counts the exchange of two pathlines', () => {
    const { risk } = frameOf(
      [
        [2, 0.5],
        [0.4, 3],
      ],
      [0, 1],
    );
    expect(risk(0, 0.01)).toBeCloseTo(calibrated(2, 0.01 + 0.2 / 3), 14);
    expect(risk(1, 0.01)).toBeCloseTo(calibrated(3, 0.01 + 0.2 / 2), 14);
    // Without strays both are as probable to be wrong: they can only be wrong together.
    expect(risk(0, 0)).toBeCloseTo(risk(1, 0), 14);
  });

  it('is none from a detection that another pathline needs, unless that one could take this one', () => {
    const { risk } = frameOf(
      [
        [2, 0.5],
        [0, 3],
      ],
      [0, 1],
    );
    expect(risk(0, 0.01)).toBeCloseTo(calibrated(2, 0.01), 14);
    expect(risk(0, 0)).toBe(0);
  });

  it('counts free detections that it could have, and pathlines without a detection that want this one', () => {
    const { risk, lone } = frameOf(
      [
        [2, 0, 0.3, 0.1],
        [0.7, 0, 0, 0],
        [0.2, 1.5, 0, 0],
        [0.25, 0.8, 0, 0],
      ],
      [0, -1, 1, -1],
    );
    // The second and fourth pathline got nothing: they want the first column with 0.7 + 0.25, the second with 0.8.
    expect(lone[0]).toBeCloseTo(0.95, 15);
    expect(lone.slice(1)).toEqual([0.8, 0, 0]);
    expect(risk(0, 0.05)).toBeCloseTo(calibrated(2, 0.05 + 0.95 + 0.3 + 0.1), 14);
    expect(risk(2, 0.05)).toBeCloseTo(calibrated(1.5, 0.05 + 0.8), 14);
  });

  it('adds up exchanges with several others', () => {
    const { risk } = frameOf(
      [
        [4, 1, 2],
        [0.5, 3, 0],
        [0.25, 0, 5],
      ],
      [0, 1, 2],
    );
    expect(risk(0, 0.1)).toBeCloseTo(calibrated(4, 0.1 + (1 * 0.5) / 3 + (2 * 0.25) / 5), 14);
  });

  it('does not depend on the unit of length', () => {
    const density = [
      [2, 0.5],
      [0.4, 3],
    ];
    const plain = frameOf(density, [0, 1]).risk(0, 0.3);
    for (const unit of [2 ** -40, 2 ** 30]) {
      const scaled = density.map((line) => line.map((value) => value * unit));
      expect(frameOf(scaled, [0, 1]).risk(0, 0.3 * unit)).toBe(plain);
    }
  });

  it('is between nothing and one, and grows with all that speaks against the link', () => {
    expect(calibrated(1, 0)).toBe(0);
    let before = 0;
    // From what can hardly be told from nothing to what is all but certain.
    for (let power = -12; power <= 12; power += 0.05) {
      const risk = calibrated(1, 10 ** power);
      expect(risk).toBeGreaterThan(before);
      expect(risk).toBeLessThan(1);
      before = risk;
    }
    // By the calibration alone small risks are stated larger than reckoned, large ones smaller.
    expect(calibrated(1, 1e-6)).toBeGreaterThan(1e-6);
    expect(calibrated(1, 1)).toBeLessThan(0.5);
  });

  it('is between nothing and one in any frame', () => {
    const random = randomStream(71, 'frames');
    let seen = 0;
    for (let trial = 0; trial < 400; trial++) {
      const rows = 1 + Math.floor(6 * random.uniform());
      const columns = 1 + Math.floor(6 * random.uniform());
      const size = () => (random.uniform() < 0.4 ? 0 : 10 ** (8 * random.uniform() - 4));
      const density = Array.from({ length: rows }, () => Array.from({ length: columns }, size));
      // Any assignment, not only good ones.
      const taken = new Set<number>();
      const columnOf = density.map((line) => {
        const free = line.findIndex((value, column) => value > 0 && !taken.has(column) && random.uniform() < 0.7);
        if (free >= 0) taken.add(free);
        return free;
      });
      const { risk } = frameOf(density, columnOf);
      for (const [row, column] of columnOf.entries()) {
        if (column < 0) continue;
        seen++;
        const value = risk(row, 10 ** (6 * random.uniform() - 6));
        expect(value).toBeGreaterThan(0);
        expect(value).toBeLessThan(1);
      }
    }
    expect(seen).toBeGreaterThan(500);
  });
});

describe('fall of a surprise', () => {
  it('is (1 + q / 4)^-4: one at the prediction, less ever farther, nowhere less than by Gauss', () => {
    expect(decay(0)).toBe(1);
    expect(decay(4)).toBe(1 / 16);
    expect(decay(12)).toBe(1 / 256);
    let before = 1;
    for (let q = 0.25; q < 60; q += 0.25) {
      expect(decay(q)).toBeLessThan(before);
      expect(decay(q)).toBeGreaterThan(Math.exp(-q));
      before = decay(q);
    }
    // As Gauss's near the prediction: both fall by q there.
    expect((1 - decay(1e-6)) / 1e-6).toBeCloseTo(1, 5);
  });
});
