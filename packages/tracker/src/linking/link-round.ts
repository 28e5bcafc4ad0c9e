import { GroupedAssignment } from './assign-exact.js';
import { assignQuickly } from './assign-quick.js';
import { type CandidateSearch, PRICE } from './candidate-search.js';
import { ENDED, type FrameLinks } from './frame-links.js';
import { linkRisk, loneRivals } from './link-risk.js';

/**
 * Assigns the candidates of one round one to one and states the risk of every link. Buffers are kept; one object a
 * thread.
 */
export class LinkRound {
  private readonly grouped = new GroupedAssignment();
  private edgeOfRow = new Int32Array(0);
  private queue = new Int32Array(0);
  private rowOfColumn = new Int32Array(0);
  private loneDensity = new Float64Array(0);

  /**
   * `stray`: density of detections of no pathline; links above `limit` are left out and, if `final`, end their
   * pathline. Returns how many were left out.
   */
  run(
    search: CandidateSearch,
    links: FrameLinks,
    exact: boolean,
    stray: number,
    limit: number,
    final: boolean,
  ): number {
    const { candidates, rowEntry, trustOfRow } = search;
    const { rows, columns, column } = candidates;
    this.fit(rows, columns);
    const { edgeOfRow, rowOfColumn, queue, loneDensity } = this;
    rowOfColumn.fill(-1, 0, columns);
    if (exact) this.grouped.assign(candidates, PRICE, edgeOfRow, rowOfColumn);
    else assignQuickly(candidates, edgeOfRow, rowOfColumn, queue);
    const assignment = { edgeOfRow, rowOfColumn };
    loneRivals(candidates, assignment, loneDensity);
    let leftOut = 0;
    for (let row = 0; row < rows; row++) {
      const edge = edgeOfRow[row];
      if (edge < 0) continue;
      const risk = linkRisk(candidates, assignment, row, stray * (1 - trustOfRow[row]), loneDensity);
      if (risk <= limit) links.link(rowEntry[row], column[edge], risk);
      else {
        leftOut++;
        if (final) links.took[rowEntry[row]] = ENDED;
      }
    }
    return leftOut;
  }

  private fit(rows: number, columns: number): void {
    if (this.edgeOfRow.length < rows) {
      this.edgeOfRow = new Int32Array(rows * 2);
      this.queue = new Int32Array(rows * 2);
    }
    if (this.rowOfColumn.length < columns) {
      this.rowOfColumn = new Int32Array(columns * 2);
      this.loneDensity = new Float64Array(columns * 2);
    }
  }
}
