import type { DetectionBlock, Dims } from '../core/columns.js';
import { CellIndex } from '../math/cell-index.js';
import type { ActivePathlines } from './active-pathlines.js';
import { peakDensity, surpriseDecay } from './candidate-search.js';
import type { FlowGrid } from './flow-grid.js';
import type { Predictors } from './predictors.js';

/** A third detection may lie this many expected squares from the straight continuation of the first two. */
const BEND_GATE = 9;

/** Where the search for lone triples stands: what one frame left over. Borrowed. */
export interface Leftovers {
  readonly active: ActivePathlines;
  readonly block: DetectionBlock;
  /** Rows of the frame. */
  readonly from: number;
  readonly to: number;
  readonly time: number;
  /** Entry chosen for each active pathline, negative: none. */
  readonly edgeOfRow: Int32Array;
  /** Active pathline of each column (row - from), -1: free. */
  readonly rowOfColumn: Int32Array;
}

/**
 * Starts pathlines where the flow picture is wrong: a detection of this frame and lone ones of the last two that lie
 * on a straight line at even steps, within what constant velocity usually misses by, and whose step is within reach
 * of the flow. One such step alone would be chance too often; three lone detections in line rarely are.
 *
 * Finds at most one triple a detection; the last link of it is made, the first detection stays alone. Buffers are
 * kept between frames; one object a thread.
 */
export class Rescue {
  private readonly dims: Dims;
  private readonly reach: number;
  private readonly depthNoise: number;
  private readonly older = new CellIndex();
  private readonly free = new CellIndex();
  private readonly flow = new Float64Array(3);
  private olderEntry = new Int32Array(0);
  private olderX = new Float64Array(0);
  private olderY = new Float64Array(0);
  private olderZ = new Float64Array(0);
  private freeX = new Float64Array(0);
  private freeY = new Float64Array(0);
  private freeZ = new Float64Array(0);
  private freeColumn = new Int32Array(0);
  private nearOlder = new Int32Array(0);
  private nearFree = new Int32Array(0);
  /** Active pathline that each column is given to, -1: none; its risk; and the pathline it makes needless. */
  given = new Int32Array(0);
  risk = new Float64Array(0);
  needless = new Int32Array(0);

  /** Reach in plane, length unit; depth as the linker's. */
  constructor(dims: Dims, reach: number, depthNoise: number) {
    this.dims = dims;
    this.reach = reach;
    this.depthNoise = depthNoise;
  }

  /** Looks at one frame; results stand in `given`, `risk`, `needless`. `density`: stray detections per area (volume). */
  look(left: Leftovers, picture: FlowGrid, predictors: Predictors, density: number): void {
    const columns = left.to - left.from;
    this.reserve(left.active.count, columns);
    this.given.fill(-1, 0, columns);
    const older = this.gatherOlder(left);
    const free = this.gatherFree(left);
    if (older === 0 || free === 0) return;
    const { dims, reach, depthNoise } = this;
    const reaches: [number, number, number] = [reach, reach, reach * (dims === 3 ? depthNoise : 1)];
    this.older.build({ x: this.olderX, y: this.olderY, z: this.olderZ }, 0, older, dims, reaches);
    this.free.build({ x: this.freeX, y: this.freeY, z: this.freeZ }, 0, free, dims, reaches);
    const { active } = left;
    for (let i = 0; i < active.count; i++) {
      if (active.age[i] === 1 && active.missed[i] === 0 && left.edgeOfRow[i] < 0) {
        this.tryMiddle(i, left, picture, predictors, density);
      }
    }
  }

  /** Looks for a first and a third detection to the lone middle one `i`. */
  private tryMiddle(i: number, left: Leftovers, picture: FlowGrid, predictors: Predictors, density: number): void {
    const { active, time } = left;
    const { flow, dims, reach } = this;
    const depth = dims === 3 ? 1 / this.depthNoise : 1;
    const x = active.x[i];
    const y = active.y[i];
    const z = active.z[i];
    const step = time - active.time[i];
    picture.at(x, y, z, flow);
    const bend = predictors.bendIn(picture.cellAt(x, y, z));
    const gate = Math.min(BEND_GATE * bend, reach * reach);
    const firsts = this.older.near(x - step * flow[0], y - step * flow[1], z - step * flow[2], this.nearOlder);
    let bestColumn = -1;
    let bestFirst = -1;
    let least = Number.POSITIVE_INFINITY;
    let tried = 0;
    for (let n = 0; n < firsts; n++) {
      const first = this.olderEntry[this.nearOlder[n]];
      const before = active.time[i] - active.time[first];
      if (!(before > 0)) continue;
      tried++;
      const scale = step / before;
      const px = x + scale * (x - active.x[first]);
      const py = y + scale * (y - active.y[first]);
      const pz = z + scale * (z - active.z[first]);
      const thirds = this.free.near(px, py, pz, this.nearFree);
      for (let m = 0; m < thirds; m++) {
        const slot = this.nearFree[m];
        const dx = this.freeX[slot] - px;
        const dy = this.freeY[slot] - py;
        const dz = dims === 3 ? (this.freeZ[slot] - pz) * depth : 0;
        const square = dx * dx + dy * dy + dz * dz;
        if (square < least) {
          least = square;
          bestColumn = this.freeColumn[slot];
          bestFirst = first;
        }
      }
    }
    if (bestColumn === -1 || least > gate) return;
    const own = 0.5 * peakDensity(dims, bend) * surpriseDecay(dims, least / bend);
    const against = density * tried;
    const risk = against / (own + against);
    if (this.given[bestColumn] !== -1 && this.risk[bestColumn] <= risk) return;
    this.given[bestColumn] = i;
    this.risk[bestColumn] = risk;
    this.needless[bestColumn] = bestFirst;
  }

  /** Lone detections of the frame before the last. */
  private gatherOlder({ active, edgeOfRow }: Leftovers): number {
    let count = 0;
    for (let i = 0; i < active.count; i++) {
      if (active.age[i] !== 1 || active.missed[i] !== 1 || edgeOfRow[i] >= 0) continue;
      this.olderEntry[count] = i;
      this.olderX[count] = active.x[i];
      this.olderY[count] = active.y[i];
      this.olderZ[count] = active.z[i];
      count++;
    }
    return count;
  }

  /** Detections of this frame that no pathline has taken. */
  private gatherFree({ block, from, to, rowOfColumn }: Leftovers): number {
    let count = 0;
    for (let row = from; row < to; row++) {
      if (rowOfColumn[row - from] !== -1) continue;
      this.freeColumn[count] = row - from;
      this.freeX[count] = block.x[row];
      this.freeY[count] = block.y[row];
      this.freeZ[count] = this.dims === 3 ? block.z[row] : 0;
      count++;
    }
    return count;
  }

  private reserve(rows: number, columns: number): void {
    if (this.olderEntry.length < rows) {
      const size = rows * 2;
      this.olderEntry = new Int32Array(size);
      this.nearOlder = new Int32Array(size);
      this.olderX = new Float64Array(size);
      this.olderY = new Float64Array(size);
      this.olderZ = new Float64Array(size);
    }
    if (this.given.length < columns) {
      const size = columns * 2;
      this.given = new Int32Array(size);
      this.needless = new Int32Array(size);
      this.risk = new Float64Array(size);
      this.freeColumn = new Int32Array(size);
      this.nearFree = new Int32Array(size);
      this.freeX = new Float64Array(size);
      this.freeY = new Float64Array(size);
      this.freeZ = new Float64Array(size);
    }
  }
}
