/**
 * Candidate links of one frame in compressed rows: pathline i may go to detection `column[e]` at `cost[e]`,
 * e in start[i] .. start[i + 1] - 1. Cost is the squared distance to the prediction over its expected square,
 * plus a handicap for pathlines that are only just born. Buffers grow and are kept from frame to frame.
 */
export class Candidates {
  rows = 0;
  columns = 0;
  edges = 0;
  start = new Int32Array(1);
  column = new Int32Array(0);
  cost = new Float64Array(0);
  /** Probability density of a true detection at this candidate, per area (volume) of link space. */
  density = new Float64Array(0);

  begin(rows: number, columns: number): void {
    this.rows = rows;
    this.columns = columns;
    this.edges = 0;
    if (this.start.length < rows + 1) this.start = new Int32Array(rows * 2 + 1);
    this.start[0] = 0;
  }

  /** Makes room for an edge to `column` among those of the last row, which stay in order of their columns. Its number. */
  insert(row: number, column: number): number {
    let e = this.edges++;
    const first = this.start[row];
    while (e > first && this.column[e - 1] > column) {
      this.column[e] = this.column[e - 1];
      this.cost[e] = this.cost[e - 1];
      this.density[e] = this.density[e - 1];
      e--;
    }
    this.column[e] = column;
    return e;
  }

  /** Room for `more` further edges. */
  reserve(more: number): void {
    if (this.edges + more <= this.column.length) return;
    const size = Math.max(1024, (this.edges + more) * 2);
    const column = new Int32Array(size);
    column.set(this.column.subarray(0, this.edges));
    const cost = new Float64Array(size);
    cost.set(this.cost.subarray(0, this.edges));
    const density = new Float64Array(size);
    density.set(this.density.subarray(0, this.edges));
    this.column = column;
    this.cost = cost;
    this.density = density;
  }
}
