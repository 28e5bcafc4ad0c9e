/** Rows with their candidate columns in compressed form; a candidate stands at most once in a row. */
export interface SparseCosts {
  readonly rows: number;
  readonly columns: number;
  /** Candidates of row i are entries start[i] .. start[i + 1] - 1. [rows + 1] */
  readonly start: Int32Array;
  readonly column: Int32Array;
  readonly cost: Float64Array;
}

/**
 * Exact one-to-one assignment: chooses for each row one of its candidates or none, no column twice, so that the
 * sum of chosen costs plus `price` for each row left out is least. Successive shortest augmenting paths with
 * potentials (Edmonds & Karp 1972, doi:10.1145/321694.321699; Tomizawa 1971), on one group of rows at a time.
 *
 * Cost O(r^2 c) for a group of r rows and c columns: meant for the small groups that conflicts make. Ties go to
 * the lower column. Buffers live in the object: use one object a thread, not re-entrant within a call.
 */
export class ExactAssignment {
  private rowPotential = new Float64Array(0);
  private columnPotential = new Float64Array(0);
  private distance = new Float64Array(0);
  private parentRow = new Int32Array(0);
  private visited = new Uint8Array(0);
  private reachedColumns = new Int32Array(0);

  /**
   * Solves the rows listed in `group` (all their candidate columns must be free of other rows).
   * Writes the chosen column (or -1) of each row to `columnOfRow` and the row (or -1) to `rowOfColumn`,
   * whose entries for these rows and columns must be -1 on entry.
   */
  solve(
    costs: SparseCosts,
    group: Int32Array,
    groupSize: number,
    price: number,
    columnOfRow: Int32Array,
    rowOfColumn: Int32Array,
  ): void {
    this.fit(costs.rows, costs.columns);
    const { rowPotential, columnPotential } = this;
    for (let g = 0; g < groupSize; g++) {
      const row = group[g];
      // Potentials start at 0 for columns; a row starts at its cheapest choice, so reduced costs are >= 0.
      let least = price;
      for (let e = costs.start[row]; e < costs.start[row + 1]; e++) {
        columnPotential[costs.column[e]] = 0;
        if (costs.cost[e] < least) least = costs.cost[e];
      }
      rowPotential[row] = least;
    }
    for (let g = 0; g < groupSize; g++) this.augment(costs, group[g], price, columnOfRow, rowOfColumn);
  }

  /** Finds the shortest augmenting path from a new row to a free column or to a row that gives up its column. */
  private augment(
    costs: SparseCosts,
    newRow: number,
    price: number,
    columnOfRow: Int32Array,
    rowOfColumn: Int32Array,
  ): void {
    const { rowPotential, columnPotential, distance, parentRow, visited, reachedColumns } = this;
    let reached = 0;
    let row = newRow;
    let here = 0;
    let bestGiveUp = Number.POSITIVE_INFINITY;
    let giveUpRow = -1;
    let freeColumn = -1;
    let end = 0;
    for (;;) {
      const giveUp = here + price - rowPotential[row];
      if (giveUp < bestGiveUp) {
        bestGiveUp = giveUp;
        giveUpRow = row;
      }
      for (let e = costs.start[row]; e < costs.start[row + 1]; e++) {
        const column = costs.column[e];
        if (visited[column] === 2) continue;
        const through = here + costs.cost[e] - rowPotential[row] - columnPotential[column];
        if (visited[column] === 0) {
          visited[column] = 1;
          reachedColumns[reached++] = column;
          distance[column] = through;
          parentRow[column] = row;
        } else if (through < distance[column]) {
          distance[column] = through;
          parentRow[column] = row;
        }
      }
      let next = -1;
      let least = bestGiveUp;
      for (let r = 0; r < reached; r++) {
        const column = reachedColumns[r];
        if (visited[column] !== 1) continue;
        if (distance[column] < least || (distance[column] === least && next !== -1 && column < next)) {
          least = distance[column];
          next = column;
        }
      }
      if (next === -1) {
        end = bestGiveUp;
        break;
      }
      visited[next] = 2;
      if (rowOfColumn[next] === -1) {
        freeColumn = next;
        end = distance[next];
        break;
      }
      row = rowOfColumn[next];
      here = distance[next];
    }
    // New potentials keep all reduced costs >= 0 (Dijkstra with potentials).
    rowPotential[newRow] += end;
    for (let r = 0; r < reached; r++) {
      const column = reachedColumns[r];
      if (visited[column] === 2 && column !== freeColumn) {
        const slack = end - distance[column];
        columnPotential[column] -= slack;
        rowPotential[rowOfColumn[column]] += slack;
      }
      visited[column] = 0;
    }
    // Walk back: shift columns along the path.
    let column = freeColumn;
    if (column === -1) {
      if (giveUpRow === newRow) return;
      column = columnOfRow[giveUpRow];
      columnOfRow[giveUpRow] = -1;
    }
    for (;;) {
      const owner = parentRow[column];
      const previous = columnOfRow[owner];
      columnOfRow[owner] = column;
      rowOfColumn[column] = owner;
      if (owner === newRow) return;
      column = previous;
    }
  }

  private fit(rows: number, columns: number): void {
    if (this.rowPotential.length < rows) this.rowPotential = new Float64Array(rows * 2);
    if (this.columnPotential.length < columns) {
      const size = columns * 2;
      this.columnPotential = new Float64Array(size);
      this.distance = new Float64Array(size);
      this.parentRow = new Int32Array(size);
      this.visited = new Uint8Array(size);
      this.reachedColumns = new Int32Array(size);
    }
  }
}
