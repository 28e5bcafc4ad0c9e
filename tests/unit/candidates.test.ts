import { Candidates } from '@wakeloom/tracker/linking/candidates';
import { describe, expect, it } from 'vitest';

describe('candidates of a row', () => {
  it('stand in the order of their columns however they were found, each with its own figures', () => {
    const candidates = new Candidates();
    candidates.begin(2, 10);
    candidates.reserve(8);
    const found = [
      [7, 3, 9, 0],
      [4, 1],
    ];
    for (const [row, columns] of found.entries()) {
      for (const column of columns) {
        const e = candidates.insert(row, column);
        candidates.cost[e] = 10 * row + column;
        candidates.density[e] = 100 + column;
      }
      candidates.start[row + 1] = candidates.edges;
    }
    expect(Array.from(candidates.column.subarray(0, 6))).toEqual([0, 3, 7, 9, 1, 4]);
    expect(Array.from(candidates.cost.subarray(0, 6))).toEqual([0, 3, 7, 9, 11, 14]);
    expect(Array.from(candidates.density.subarray(0, 6))).toEqual([100, 103, 107, 109, 101, 104]);
  });
});
