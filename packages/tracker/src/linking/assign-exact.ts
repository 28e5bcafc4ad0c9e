import { ExactAssignment } from '../math/assignment.js';
import type { Candidates } from './candidates.js';

/**
 * Exact one-to-one assignment with a price for not linking, solved per connected group of conflicts: pathlines
 * are in one group when they share a candidate detection. Most groups hold one pathline and cost nothing.
 * Buffers live in the object; one object a thread.
 */
export class GroupedAssignment {
  private readonly exact = new ExactAssignment();
  private leader = new Int32Array(0);
  private firstRow = new Int32Array(0);
  private nextInGroup = new Int32Array(0);
  private groupTail = new Int32Array(0);
  private group = new Int32Array(0);
  private columnOfRow = new Int32Array(0);

  /** As `assignQuickly`; rows stay unlinked where every choice costs more than `price`. */
  assign(candidates: Candidates, price: number, edgeOfRow: Int32Array, rowOfColumn: Int32Array): void {
    const { rows, columns, start, column } = candidates;
    this.fit(rows, columns);
    const { leader, firstRow, nextInGroup, groupTail, group, columnOfRow } = this;
    firstRow.fill(-1, 0, columns);
    for (let row = 0; row < rows; row++) {
      leader[row] = row;
      nextInGroup[row] = -1;
      groupTail[row] = row;
      columnOfRow[row] = -1;
      edgeOfRow[row] = -1;
    }
    for (let row = 0; row < rows; row++) {
      for (let e = start[row]; e < start[row + 1]; e++) {
        const owner = firstRow[column[e]];
        if (owner === -1) firstRow[column[e]] = row;
        else this.join(owner, row);
      }
    }
    for (let row = 0; row < rows; row++) {
      if (leader[row] !== row) continue;
      if (nextInGroup[row] === -1) {
        this.alone(candidates, row, price, edgeOfRow, rowOfColumn);
        continue;
      }
      let size = 0;
      for (let member = row; member !== -1; member = nextInGroup[member]) group[size++] = member;
      this.exact.solve(candidates, group, size, price, columnOfRow, rowOfColumn);
      for (let g = 0; g < size; g++) {
        const member = group[g];
        const chosen = columnOfRow[member];
        if (chosen === -1) continue;
        for (let e = start[member]; e < start[member + 1]; e++) {
          if (column[e] === chosen) edgeOfRow[member] = e;
        }
      }
    }
  }

  /** A pathline without rivals takes its cheapest candidate. */
  private alone(
    candidates: Candidates,
    row: number,
    price: number,
    edgeOfRow: Int32Array,
    rowOfColumn: Int32Array,
  ): void {
    const { start, column, cost } = candidates;
    let best = -1;
    for (let e = start[row]; e < start[row + 1]; e++) {
      if (best === -1 || cost[e] < cost[best] || (cost[e] === cost[best] && column[e] < column[best])) best = e;
    }
    if (best === -1 || cost[best] > price) return;
    edgeOfRow[row] = best;
    rowOfColumn[column[best]] = row;
  }

  /** Joins the groups of two rows; the lower leader leads, members stay in a list from leader to tail. */
  private join(a: number, b: number): void {
    const { leader, nextInGroup, groupTail } = this;
    let first = this.find(a);
    let second = this.find(b);
    if (first === second) return;
    if (second < first) [first, second] = [second, first];
    leader[second] = first;
    nextInGroup[groupTail[first]] = second;
    groupTail[first] = groupTail[second];
  }

  private find(row: number): number {
    const { leader } = this;
    let top = row;
    while (leader[top] !== top) {
      leader[top] = leader[leader[top]];
      top = leader[top];
    }
    return top;
  }

  private fit(rows: number, columns: number): void {
    if (this.leader.length < rows) {
      const size = rows * 2;
      this.leader = new Int32Array(size);
      this.nextInGroup = new Int32Array(size);
      this.groupTail = new Int32Array(size);
      this.group = new Int32Array(size);
      this.columnOfRow = new Int32Array(size);
    }
    if (this.firstRow.length < columns) this.firstRow = new Int32Array(columns * 2);
  }
}
