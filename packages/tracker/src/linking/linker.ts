import type { DetectionBlock, Dims } from '../core/columns.js';
import type { NeighbourSearch } from '../math/neighbour-search.js';
import { ActivePathlines } from './active-pathlines.js';
import { GroupedAssignment } from './assign-exact.js';
import { assignQuickly } from './assign-quick.js';
import { Candidates } from './candidates.js';
import { decay, linkRisk, loneRivals } from './link-risk.js';
import type { FlowPictures } from './pictures.js';
import { GUESS_SIZE, Predictors } from './predictors.js';
import { Rescue } from './rescue.js';

/** Gate: a candidate farther than this many times its expected square (mean over axes) is none. exp(-16) = 1e-7. */
const GATE = 16;
/** Handicap of a pathline with a single detection against one that has proved itself, in units of expected squares. */
const NEWBORN_HANDICAP = 3;
/** Share of the records kept from frame to frame: a memory of about 20 frames. */
const RECORD_KEEP = 0.95;
/** Weight of the newest link in a pathline's own deviation from the flow picture. */
const DEVIATION_GAIN = 0.5;
const AGE_CAP = 200;
/** Mark of a pathline whose link was left out for its risk: it ends. */
const ENDED = -2;
/** Mark of a lone detection that was linked with two others in line. */
const RESCUED = -3;

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
 * Links frame after frame. State is one entry for each pathline in view, a coarse picture of the flow and the
 * record of earlier surprises: memory does not grow with the number of frames. Uses only + - * / and sqrt.
 */
export class Linker {
  readonly tally: LinkTally = { links: 0, bridging: 0, leftOutForRisk: 0, pathlines: 0 };
  private readonly options: LinkerOptions;
  private readonly depth: number;
  private readonly reaches: [number, number, number];
  private readonly predictors: Predictors;
  private readonly candidates = new Candidates();
  private readonly grouped = new GroupedAssignment();
  private active = new ActivePathlines();
  private spare = new ActivePathlines();
  private nextId = 0;
  private segment = Number.NaN;
  private near = new Int32Array(0);
  private edgeOfRow = new Int32Array(0);
  private queue = new Int32Array(0);
  private rowOfColumn = new Int32Array(0);
  private loneDensity = new Float64Array(0);
  private columnRisk = new Float64Array(0);
  private readonly rescue: Rescue;
  private guessOfRow = new Float64Array(0);
  private cellOfRow = new Int32Array(0);
  private straySum = 0;
  private strayWeight = 0;
  private readonly flowAt = new Float64Array(3);

  constructor(options: LinkerOptions) {
    this.options = options;
    this.depth = options.dims === 3 ? 1 / options.depthNoise : 1;
    this.reaches = [options.reach, options.reach, options.reach * (options.dims === 3 ? options.depthNoise : 1)];
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
    this.collect(block, from, to, time);
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

  /** Gathers the candidates of every active pathline. */
  private collect(block: DetectionBlock, from: number, to: number, time: number): void {
    const { active, candidates, predictors, near, depth, options } = this;
    const { search, dims } = options;
    const reachSquare = options.reach * options.reach;
    candidates.begin(active.count, to - from);
    if (this.guessOfRow.length < active.count * GUESS_SIZE) {
      this.guessOfRow = new Float64Array(active.count * GUESS_SIZE * 2);
      this.cellOfRow = new Int32Array(active.count * 2);
    }
    const { guessOfRow, cellOfRow } = this;
    search.build(block, from, to, dims, this.reaches);
    const { x, y, z } = block;
    for (let i = 0; i < active.count; i++) {
      predictors.predict(active, i, time);
      guessOfRow.set(predictors.guess, i * GUESS_SIZE);
      cellOfRow[i] = predictors.cell;
      const { expected } = predictors;
      const newborn = active.age[i] < 2;
      const gate = Math.min(GATE * expected, reachSquare);
      const handicap = newborn ? NEWBORN_HANDICAP : 0;
      const scale = 1 / expected;
      // Peak density of the surprise: 1 / (pi E) in the plane (Gaussian with E = 2 s^2), (3 / 2 pi E)^(3/2) in space.
      const peak = dims === 2 ? scale * (1 / Math.PI) : scale * Math.sqrt(scale) * 0.329843;
      const found = search.near(predictors.x, predictors.y, predictors.z, near);
      candidates.reserve(found);
      for (let n = 0; n < found; n++) {
        const row = near[n];
        const dx = x[row] - predictors.x;
        const dy = y[row] - predictors.y;
        const dz = dims === 3 ? (z[row] - predictors.z) * depth : 0;
        const square = dx * dx + dy * dy + dz * dz;
        if (square > gate) continue;
        const q = square * scale;
        const e = candidates.edges++;
        candidates.column[e] = row - from;
        candidates.cost[e] = q + handicap;
        // In space the exponent is 3/2 q; a newborn may itself be a stray detection.
        const density = peak * decay(dims === 2 ? q : 1.5 * q) * (newborn ? 0.5 : 1);
        candidates.density[e] = density;
      }
      candidates.start[i + 1] = candidates.edges;
    }
  }

  private assign(columns: number): void {
    const { candidates, edgeOfRow, rowOfColumn, queue, options } = this;
    rowOfColumn.fill(-1, 0, columns);
    if (options.care === 'quick') assignQuickly(candidates, edgeOfRow, rowOfColumn, queue);
    else this.grouped.assign(candidates, GATE + NEWBORN_HANDICAP, edgeOfRow, rowOfColumn);
  }

  /** States the risk of every link chosen, then leaves out those above the limit. */
  private judge(columns: number): void {
    const { candidates, edgeOfRow, rowOfColumn, columnRisk, loneDensity, options, tally } = this;
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
    const { tally, depth, guessOfRow, cellOfRow } = this;
    spare.count = 0;
    spare.reserve(to - from + active.count);
    predictors.fade(RECORD_KEEP);
    let strays = 0;
    for (let row = from; row < to; row++) {
      const column = row - from;
      const i = rowOfColumn[column];
      const x = block.x[row];
      const y = block.y[row];
      const z = dims === 3 ? block.z[row] : 0;
      const j = spare.count++;
      spare.x[j] = x;
      spare.y[j] = y;
      spare.z[j] = z;
      spare.time[j] = time;
      spare.missed[j] = 0;
      if (i === -1) {
        strays++;
        spare.id[j] = this.nextId;
        pathline[row] = this.nextId++;
        risk[row] = 0;
        spare.age[j] = 1;
        spare.u[j] = spare.v[j] = spare.w[j] = Number.NaN;
        spare.u0[j] = spare.v0[j] = spare.w0[j] = Number.NaN;
        spare.du[j] = spare.dv[j] = spare.dw[j] = 0;
        continue;
      }
      pathline[row] = active.id[i];
      risk[row] = columnRisk[column];
      tally.links++;
      if (active.missed[i] > 0) tally.bridging++;
      this.extend(active, i, j, x, y, z, time);
      if (active.missed[i] === 0 && active.age[i] >= 3 && edgeOfRow[i] >= 0) {
        const guess = guessOfRow.subarray(i * GUESS_SIZE, (i + 1) * GUESS_SIZE);
        predictors.learn(x, y, z, depth, cellOfRow[i], guess);
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

  /** Entry `j` of the next set: pathline `i` grown by a detection. */
  private extend(active: ActivePathlines, i: number, j: number, x: number, y: number, z: number, time: number): void {
    const { spare, flowAt, options } = this;
    const flow = options.pictures.main;
    const perStep = 1 / (time - active.time[i]);
    const u = (x - active.x[i]) * perStep;
    const v = (y - active.y[i]) * perStep;
    const w = (z - active.z[i]) * perStep;
    const mx = 0.5 * (x + active.x[i]);
    const my = 0.5 * (y + active.y[i]);
    const mz = 0.5 * (z + active.z[i]);
    const age = active.age[i];
    const known = flow.at(mx, my, mz, flowAt);
    const du = known > 0 ? u - flowAt[0] : 0;
    const dv = known > 0 ? v - flowAt[1] : 0;
    const dw = known > 0 ? w - flowAt[2] : 0;
    const gain = age < 2 ? 1 : DEVIATION_GAIN;
    spare.id[j] = active.id[i];
    spare.u[j] = u;
    spare.v[j] = v;
    spare.w[j] = w;
    spare.mx[j] = mx;
    spare.my[j] = my;
    spare.mz[j] = mz;
    spare.u0[j] = active.u[i];
    spare.v0[j] = active.v[i];
    spare.w0[j] = active.w[i];
    spare.du[j] = active.du[i] + gain * (du - active.du[i]);
    spare.dv[j] = active.dv[i] + gain * (dv - active.dv[i]);
    spare.dw[j] = active.dw[i] + gain * (dw - active.dw[i]);
    spare.age[j] = age < AGE_CAP ? age + 1 : AGE_CAP;
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
      this.near = new Int32Array(size);
    }
  }
}
