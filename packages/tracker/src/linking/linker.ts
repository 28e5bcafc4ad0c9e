import type { DetectionBlock, Dims } from '../core/columns.js';
import type { NeighbourSearch } from '../math/neighbour-search.js';
import { ActivePathlines } from './active-pathlines.js';
import { GroupedAssignment } from './assign-exact.js';
import { assignQuickly } from './assign-quick.js';
import { CandidateSearch, PRICE } from './candidate-search.js';
import { beginPathline, growPathline } from './grow-pathline.js';
import { linkRisk, loneRivals } from './link-risk.js';
import type { FlowPictures } from './pictures.js';
import { GUESS_SIZE, Predictors } from './predictors.js';
import { Rescue } from './rescue.js';

/** Share of the records kept from frame to frame: a memory of about 20 frames. */
const RECORD_KEEP = 0.95;
/** Mark of a pathline whose link was left out for its risk: it ends. */
const ENDED = -2;
/** Mark of a lone detection that was linked with two others in line. */
const RESCUED = -3;

/** What a linker works with. */
export interface LinkerOptions {
  readonly dims: Dims;
  /** How far from its prediction a detection may lie, length unit, in plane; depth is this times `depthNoise`. */
  readonly reach: number;
  readonly bridge: number;
  readonly care: 'quick' | 'thorough';
  readonly riskLimit: number;
  /** Position noise along z over that in plane (1 in the plane): distances along z count that much less. */
  readonly depthNoise: number;
  /** Least expected square of a surprise: that of position noise alone, length unit squared. */
  readonly noiseSquare: number;
  /** Expected square of a true detection's distance from the first flow picture, length unit squared. */
  readonly expected: number;
  /** Particles per area (volume) of link space (z divided by depthNoise). */
  readonly density: number;
  readonly pictures: FlowPictures;
  readonly search: NeighbourSearch;
}

/** What the linker counted. */
export interface LinkTally {
  links: number;
  bridging: number;
  leftOutForRisk: number;
  pathlines: number;
}

/**
 * Links frame after frame. State is one entry for each pathline in view, coarse pictures of the flow and the
 * record of earlier surprises: memory does not grow with the number of frames. Uses only + - * / and sqrt.
 */
export class Linker {
  readonly tally: LinkTally = { links: 0, bridging: 0, leftOutForRisk: 0, pathlines: 0 };
  private readonly options: LinkerOptions;
  private readonly depth: number;
  private readonly predictors: Predictors;
  private readonly search: CandidateSearch;
  private readonly grouped = new GroupedAssignment();
  private active = new ActivePathlines();
  private spare = new ActivePathlines();
  private nextId = 0;
  private segment = Number.NaN;
  private edgeOfRow = new Int32Array(0);
  private queue = new Int32Array(0);
  private rowOfColumn = new Int32Array(0);
  private loneDensity = new Float64Array(0);
  private columnRisk = new Float64Array(0);
  private readonly rescue: Rescue;
  private straySum = 0;
  private strayWeight = 0;
  private readonly flowAt = new Float64Array(3);

  constructor(options: LinkerOptions) {
    this.options = options;
    this.depth = options.dims === 3 ? 1 / options.depthNoise : 1;
    this.search = new CandidateSearch(options.dims, options.reach, options.depthNoise, options.search);
    this.rescue = new Rescue(options.dims, options.reach, options.depthNoise);
    this.predictors = new Predictors(
      options.pictures.all,
      options.noiseSquare,
      Math.max(options.expected, options.noiseSquare),
    );
  }

  /** Number of pathlines begun so far; provisional numbers are below it. */
  get begun(): number {
    return this.nextId;
  }

  /**
   * Links frame `k` of `block`: writes the pathline number and the risk of the link into each of its rows to
   * `pathline` and `risk` (arrays of the block's rows).
   */
  frame(block: DetectionBlock, k: number, pathline: Int32Array, risk: Float32Array): void {
    const from = block.offsets[k];
    const to = block.offsets[k + 1];
    const time = block.time[k];
    const step = block.number[k];
    if (block.segment[k] !== this.segment) {
      this.active.count = 0;
      this.segment = block.segment[k];
      this.lastNumber = step;
    }
    // Frames without any detection do not stand in a block: they count as missed all the same.
    const gap = Math.max(0, step - this.lastNumber - 1);
    this.lastNumber = step;
    if (gap > 0) this.skip(gap);
    this.fit(to - from);
    this.search.collect(this.active, block, from, to, time, this.predictors);
    this.assign(to - from);
    this.judge(to - from);
    this.rescueLone(block, from, to, time);
    this.settle(block, from, to, time, pathline, risk);
  }

  private lastNumber = 0;

  /** Ages all pathlines by `gap` frames that hold no detection at all. */
  private skip(gap: number): void {
    const { active } = this;
    const kept = this.spare;
    kept.count = 0;
    kept.reserve(active.count);
    for (let i = 0; i < active.count; i++) {
      const missed = active.missed[i] + gap;
      if (missed > this.options.bridge) continue;
      active.missed[i] = missed;
      kept.carry(active, i);
    }
    this.spare = active;
    this.active = kept;
  }

  private assign(columns: number): void {
    const { edgeOfRow, rowOfColumn, queue, options } = this;
    const { candidates } = this.search;
    rowOfColumn.fill(-1, 0, columns);
    if (options.care === 'quick') assignQuickly(candidates, edgeOfRow, rowOfColumn, queue);
    else this.grouped.assign(candidates, PRICE, edgeOfRow, rowOfColumn);
  }

  /** States the risk of every link chosen, then leaves out those above the limit. */
  private judge(columns: number): void {
    const { edgeOfRow, rowOfColumn, columnRisk, loneDensity, options, tally } = this;
    const { candidates } = this.search;
    const assignment = { edgeOfRow, rowOfColumn };
    const stray = this.strayDensity();
    loneRivals(candidates, assignment, loneDensity);
    for (let column = 0; column < columns; column++) {
      const row = rowOfColumn[column];
      columnRisk[column] = row === -1 ? 0 : linkRisk(candidates, assignment, row, stray, loneDensity);
    }
    for (let column = 0; column < columns; column++) {
      if (rowOfColumn[column] === -1 || columnRisk[column] <= options.riskLimit) continue;
      tally.leftOutForRisk++;
      // The detection starts a pathline of its own; the old one must not contend with it for the next ones.
      edgeOfRow[rowOfColumn[column]] = ENDED;
      rowOfColumn[column] = -1;
    }
  }

  /** Links lone detections that lie in line with two earlier lone ones. */
  private rescueLone(block: DetectionBlock, from: number, to: number, time: number): void {
    const { active, edgeOfRow, rowOfColumn, columnRisk, options, rescue } = this;
    if (options.care === 'quick' || this.pairsOnly) return;
    const left = { active, block, from, to, time, edgeOfRow, rowOfColumn };
    rescue.look(left, options.pictures.main, this.predictors, this.strayDensity());
    for (let column = 0; column < to - from; column++) {
      const i = rescue.given[column];
      if (i === -1 || rescue.risk[column] > options.riskLimit) continue;
      const first = rescue.needless[column];
      if (edgeOfRow[i] >= 0 || edgeOfRow[first] === RESCUED) continue;
      const perStep = 1 / (active.time[i] - active.time[first]);
      active.u[i] = (active.x[i] - active.x[first]) * perStep;
      active.v[i] = (active.y[i] - active.y[first]) * perStep;
      active.w[i] = (active.z[i] - active.z[first]) * perStep;
      active.age[i] = 2;
      edgeOfRow[first] = ENDED;
      edgeOfRow[i] = RESCUED;
      rowOfColumn[column] = i;
      columnRisk[column] = rescue.risk[column];
    }
  }

  /** Turns assignments into links, starts new pathlines, carries on those that missed, and learns. */
  private settle(
    block: DetectionBlock,
    from: number,
    to: number,
    time: number,
    pathline: Int32Array,
    risk: Float32Array,
  ): void {
    const { active, spare, edgeOfRow, rowOfColumn, columnRisk, options, predictors } = this;
    const { dims, bridge } = options;
    const { tally, depth, flowAt } = this;
    const { guessOfRow, cellOfRow } = this.search;
    spare.count = 0;
    spare.reserve(to - from + active.count);
    predictors.fade(RECORD_KEEP);
    let strays = 0;
    for (let row = from; row < to; row++) {
      const column = row - from;
      const i = rowOfColumn[column];
      const place = { x: block.x[row], y: block.y[row], z: dims === 3 ? block.z[row] : 0, time };
      if (i === -1) {
        strays++;
        beginPathline(spare, this.nextId, place);
        pathline[row] = this.nextId++;
        risk[row] = 0;
        continue;
      }
      growPathline(active, i, spare, place, options.pictures.main, flowAt);
      pathline[row] = active.id[i];
      risk[row] = columnRisk[column];
      tally.links++;
      if (active.missed[i] > 0) tally.bridging++;
      if (active.missed[i] === 0 && active.age[i] >= 3 && edgeOfRow[i] >= 0) {
        const guess = guessOfRow.subarray(i * GUESS_SIZE, (i + 1) * GUESS_SIZE);
        predictors.learn(place.x, place.y, place.z, depth, cellOfRow[i], guess);
      }
    }
    this.teach(to - from, time);
    for (let i = 0; i < active.count; i++) {
      if (edgeOfRow[i] !== -1 || active.missed[i] >= bridge) continue;
      active.missed[i]++;
      spare.carry(active, i);
    }
    this.straySum = this.straySum * RECORD_KEEP + strays;
    this.strayWeight = this.strayWeight * RECORD_KEEP + (to - from);
    tally.pathlines = this.nextId;
    this.active = spare;
    this.spare = active;
  }

  /**
   * Adds the new links to the flow picture, after all were made: what a link is compared with must not depend on
   * its place in the list. Only pathlines that have proved themselves teach, unless there are no others (pairs).
   */
  private teach(columns: number, time: number): void {
    const { active, spare, rowOfColumn, options } = this;
    options.pictures.fade();
    const fewest = this.pairsOnly ? 2 : 3;
    for (let j = 0; j < columns; j++) {
      const i = rowOfColumn[j];
      if (i === -1 || spare.age[j] < fewest) continue;
      const half = 0.5 * (time - active.time[i]);
      const u = spare.u[j];
      const v = spare.v[j];
      const w = spare.w[j];
      options.pictures.learn(spare.x[j] - half * u, spare.y[j] - half * v, spare.z[j] - half * w, u, v, w);
    }
    options.pictures.fit();
  }

  /** Set for image pairs, where no pathline ever gets older than two detections. */
  pairsOnly = false;

  /** Density of detections that belong to no pathline yet, from the share of late; at least one in a hundred. */
  private strayDensity(): number {
    const share = this.strayWeight > 0 ? this.straySum / this.strayWeight : 0.2;
    return this.options.density * (share < 0.01 ? 0.01 : Math.min(share, 0.5));
  }

  private fit(columns: number): void {
    const rows = this.active.count;
    if (this.edgeOfRow.length < rows) {
      this.edgeOfRow = new Int32Array(rows * 2);
      this.queue = new Int32Array(rows * 2);
    }
    if (this.rowOfColumn.length < columns) {
      const size = columns * 2;
      this.rowOfColumn = new Int32Array(size);
      this.loneDensity = new Float64Array(size);
      this.columnRisk = new Float64Array(size);
    }
  }
}
