import { GroupedAssignment } from '@wakeloom/tracker/linking/assign-exact';
import { assignQuickly } from '@wakeloom/tracker/linking/assign-quick';
import { Candidates } from '@wakeloom/tracker/linking/candidates';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { linearSumAssignment } from 'linear-sum-assignment';
import { describe, expect, it } from 'vitest';
import reference from '../../data/reference/linking.json';

function candidatesOf(cost: readonly (readonly number[])[]): Candidates {
  const candidates = new Candidates();
  candidates.begin(cost.length, cost[0].length);
  cost.forEach((row, i) => {
    candidates.reserve(row.length);
    row.forEach((value, j) => {
      if (!Number.isFinite(value)) return;
      candidates.column[candidates.edges] = j;
      candidates.cost[candidates.edges++] = value;
    });
    candidates.start[i + 1] = candidates.edges;
  });
  return candidates;
}

function solve(cost: readonly (readonly number[])[], price: number): { columns: number[]; total: number } {
  const candidates = candidatesOf(cost);
  const edgeOfRow = new Int32Array(cost.length);
  const rowOfColumn = new Int32Array(cost[0].length).fill(-1);
  new GroupedAssignment().assign(candidates, price, edgeOfRow, rowOfColumn);
  const columns = [...edgeOfRow].map((e) => (e < 0 ? -1 : candidates.column[e]));
  for (const [row, column] of columns.entries()) if (column >= 0) expect(rowOfColumn[column]).toBe(row);
  const total = columns.reduce((sum, column, row) => sum + (column < 0 ? price : cost[row][column]), 0);
  return { columns, total };
}

describe('exact assignment', () => {
  // The columns of some tables are not unique (equal costs): what is published is the optimum.
  it.each(reference.assignment.map((row) => [row.cost, row.min] as const))(
    'finds the published optimum of %j',
    (cost, min) => {
      const solved = solve(cost, 1e6);
      expect(new Set(solved.columns).size).toBe(cost.length);
      expect(solved.total).toBe(min);
    },
  );

  it('agrees with a general solver on random costs, with rows that had better stay free', () => {
    const random = randomStream(11, 'costs');
    for (let n = 0; n < 300; n++) {
      const rows = 1 + Math.trunc(random.uniform() * 9);
      const columns = 1 + Math.trunc(random.uniform() * 9);
      const price = 0.2 + 0.8 * random.uniform();
      const cost = Array.from({ length: rows }, () =>
        Array.from({ length: columns }, () => (random.uniform() < 0.3 ? Number.POSITIVE_INFINITY : random.uniform())),
      );
      // The general solver knows no price: each row gets a column of its own that costs the price.
      const padded = cost.map((row, i) => [
        ...row.map((value) => (Number.isFinite(value) ? value : 1e3)),
        ...cost.map((_, k) => (k === i ? price : 1e3)),
      ]);
      const { rowAssignments } = linearSumAssignment(padded, { maximaze: false });
      const best = padded.reduce((sum, row, i) => sum + row[rowAssignments[i]], 0);
      expect(solve(cost, price).total).toBeCloseTo(best, 9);
    }
  });

  it('gives mean optima of random exponential costs near the sum of 1/k^2 (Parisi 1998)', () => {
    const row = reference.parisi.rows.find((entry) => entry.n === 5)!;
    const random = randomStream(3, 'parisi');
    let sum = 0;
    let squares = 0;
    const trials = 4000;
    for (let n = 0; n < trials; n++) {
      const cost = Array.from({ length: 5 }, () => Array.from({ length: 5 }, () => -Math.log(1 - random.uniform())));
      const { total } = solve(cost, 1e6);
      sum += total;
      squares += total * total;
    }
    const mean = sum / trials;
    const error = Math.sqrt((squares / trials - mean * mean) / trials);
    expect(Math.abs(mean - row.E)).toBeLessThan(3.3 * error);
    expect(error).toBeLessThan(0.01);
  });
});

describe('quick assignment', () => {
  it('is the greedy choice over all pairs sorted by cost', () => {
    const random = randomStream(5, 'greedy');
    for (let n = 0; n < 200; n++) {
      const rows = 1 + Math.trunc(random.uniform() * 12);
      const columns = 1 + Math.trunc(random.uniform() * 12);
      const cost = Array.from({ length: rows }, () =>
        Array.from({ length: columns }, () => (random.uniform() < 0.5 ? Number.POSITIVE_INFINITY : random.uniform())),
      );
      const pairs = cost.flatMap((row, i) => row.map((value, j) => ({ value, i, j })));
      pairs.sort((a, b) => a.value - b.value);
      const greedy = new Array<number>(rows).fill(-1);
      const taken = new Set<number>();
      for (const { value, i, j } of pairs) {
        if (!Number.isFinite(value) || greedy[i] >= 0 || taken.has(j)) continue;
        greedy[i] = j;
        taken.add(j);
      }
      const candidates = candidatesOf(cost);
      const edgeOfRow = new Int32Array(rows);
      assignQuickly(candidates, edgeOfRow, new Int32Array(columns).fill(-1), new Int32Array(rows));
      expect([...edgeOfRow].map((e) => (e < 0 ? -1 : candidates.column[e]))).toEqual(greedy);
    }
  });
});
