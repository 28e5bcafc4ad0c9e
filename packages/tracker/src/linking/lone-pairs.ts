import type { DetectionBlock, Dims } from '../core/columns.js';
import { CellIndex } from '../math/cell-index.js';
import type { ActivePathlines } from './active-pathlines.js';
import type { FlowGrid } from './flow-grid.js';
import { type FrameLinks, NONE } from './frame-links.js';
import type { NeighbourFlow } from './neighbour-flow.js';
import { LEAST_WEIGHT } from './predictors.js';

/**
 * Possible links between detections that are alone: one of the last frame that no link leads from, and one of this
 * frame that none has taken, within a distance of where the flow about them would carry it. Columns in compressed rows;
 * buffers are kept, one object a thread.
 */
export class LonePairs {
  /** Lone pathlines: entry, place; pairs of lone `b` are start[b] .. start[b + 1] - 1. */
  lone = 0;
  entry = new Int32Array(0);
  x = new Float64Array(0);
  y = new Float64Array(0);
  z = new Float64Array(0);
  start = new Int32Array(1);
  /** Free detections: column in the frame. */
  free = 0;
  column = new Int32Array(0);
  /** Pairs: free detection, and its offset from where the flow would carry the lone one (z over depth noise). */
  pairs = 0;
  other = new Int32Array(0);
  offX = new Float64Array(0);
  offY = new Float64Array(0);
  offZ = new Float64Array(0);
  private freeX = new Float64Array(0);
  private freeY = new Float64Array(0);
  private freeZ = new Float64Array(0);
  private near = new Int32Array(0);
  private readonly index = new CellIndex();
  private readonly flow = new Float64Array(3);
  private readonly dims: Dims;
  private readonly reach: number;
  private readonly depth: number;

  /** `reach`: how far from where the flow leads the other may lie, length unit in plane. */
  constructor(dims: Dims, reach: number, depthNoise: number) {
    this.dims = dims;
    this.reach = reach;
    this.depth = dims === 3 ? 1 / depthNoise : 1;
  }

  /**
   * Collects the pairs of the frame that begins at row `from`. Where the flow about a lone one was looked at in this
   * frame, its prediction stands, unless `anew`. Else the flow comes from the links of this interval nearby
   * (`near`), or about twice as far (`wide`), or from those of the interval before, or else from the picture.
   */
  collect(
    active: ActivePathlines,
    block: DetectionBlock,
    from: number,
    time: number,
    links: FrameLinks,
    anew: boolean,
    near: NeighbourFlow,
    wide: NeighbourFlow,
    before: NeighbourFlow,
    picture: FlowGrid,
  ): void {
    const { reach, depth, dims, flow } = this;
    this.reserve(active.count, links.columns);
    this.gatherFree(block, from, links);
    const freePoints = { x: this.freeX, y: this.freeY, z: this.freeZ };
    this.index.build(freePoints, 0, this.free, dims, [reach, reach, reach / depth]);
    this.lone = 0;
    this.pairs = 0;
    for (let i = 0; i < active.count && this.free > 0; i++) {
      if (active.missed[i] !== 0 || links.took[i] >= 0) continue;
      const x = active.x[i];
      const y = active.y[i];
      const z = active.z[i];
      if (!anew && !Number.isNaN(active.fu[i])) {
        this.add(i, x, y, z, active.px[i], active.py[i], active.pz[i]);
        continue;
      }
      const step = time - active.time[i];
      const half = 0.5 * step;
      picture.at(x, y, z, flow);
      // Twice: the flow is read at the middle of the step that it causes.
      for (let turn = 0; turn < 2; turn++) {
        const mx = x + half * flow[0];
        const my = y + half * flow[1];
        const mz = z + half * flow[2];
        if (near.along(x, y, z, step, mx, my, mz, i, flow) > LEAST_WEIGHT) continue;
        if (wide.along(x, y, z, step, mx, my, mz, i, flow) > LEAST_WEIGHT) continue;
        // Links of the interval before bear this entry's number while no frame was missed.
        if (before.along(x, y, z, step, mx, my, mz, i, flow) > LEAST_WEIGHT) continue;
        picture.at(mx, my, mz, flow);
      }
      this.add(i, x, y, z, x + step * flow[0], y + step * flow[1], z + step * flow[2]);
    }
  }

  /** The lone pathline `i` at (x, y, z), which the flow would carry to (px, py, pz). */
  private add(i: number, x: number, y: number, z: number, px: number, py: number, pz: number): void {
    const found = this.index.near(px, py, pz, this.near);
    if (found === 0) return;
    this.reservePairs(found);
    const b = this.lone++;
    this.entry[b] = i;
    this.x[b] = x;
    this.y[b] = y;
    this.z[b] = z;
    for (let n = 0; n < found; n++) {
      const c = this.near[n];
      const p = this.pairs++;
      this.other[p] = c;
      this.offX[p] = this.freeX[c] - px;
      this.offY[p] = this.freeY[c] - py;
      this.offZ[p] = (this.freeZ[c] - pz) * this.depth;
    }
    this.start[this.lone] = this.pairs;
  }

  private gatherFree(block: DetectionBlock, from: number, { columns, takenBy }: FrameLinks): void {
    let free = 0;
    for (let column = 0; column < columns; column++) {
      if (takenBy[column] !== NONE) continue;
      this.column[free] = column;
      this.freeX[free] = block.x[from + column];
      this.freeY[free] = block.y[from + column];
      this.freeZ[free] = this.dims === 3 ? block.z[from + column] : 0;
      free++;
    }
    this.free = free;
  }

  private reserve(entries: number, columns: number): void {
    if (this.entry.length < entries) {
      const size = entries * 2;
      this.entry = new Int32Array(size);
      this.start = new Int32Array(size + 1);
      for (const name of ['x', 'y', 'z'] as const) this[name] = new Float64Array(size);
    }
    if (this.column.length < columns) {
      const size = columns * 2;
      this.column = new Int32Array(size);
      this.near = new Int32Array(size);
      for (const name of ['freeX', 'freeY', 'freeZ'] as const) this[name] = new Float64Array(size);
    }
  }

  private reservePairs(more: number): void {
    if (this.pairs + more <= this.other.length) return;
    const size = (this.pairs + more) * 2;
    const other = new Int32Array(size);
    other.set(this.other);
    this.other = other;
    for (const name of ['offX', 'offY', 'offZ'] as const) {
      const column = new Float64Array(size);
      column.set(this[name]);
      this[name] = column;
    }
  }
}
