import type { DetectionBlock, Dims } from '../core/columns.js';
import type { RunContext } from '../core/context.js';
import { CellIndex } from '../math/cell-index.js';
import { type Box, FlowGrid } from './flow-grid.js';

/** How far apart two detections of successive frames may be to vote, in mean spacings: ratios up to about 1.5. */
const VOTE_REACH = 2;
/** Width of a vote's kernel in mean spacings, first round and refinement. */
const KERNEL_COARSE = 0.3;
const KERNEL_FINE = 0.18;
const REFINEMENTS = 3;
/**
 * Discount of the longest votes: where particles stand nearly on a lattice, shifts by a lattice step gather as many
 * votes as the true one, and the shortest is by far the likeliest.
 */
const LONG_VOTE_DISCOUNT = 0.25;
/** Moves towards the mean under the kernel: enough to forget which vote they began at. */
const MEAN_SHIFTS = 10;
/** Votes of a cell beyond which only every n-th is tried as a centre: a peak holds many, one of them is near its top. */
const MOST_CENTRES = 5000;
/** A window whose best displacement gathers fewer than this many votes is left to its neighbours. */
const FEWEST_VOTES = 4;

export interface VoteOptions {
  readonly dims: Dims;
  readonly box: Box;
  /** Mean spacing of one frame's particles in link space, length unit. */
  readonly spacing: number;
  readonly depthNoise: number;
}

/** A pair of frames of one block that may be linked: indices of both. */
export interface FramePair {
  readonly block: DetectionBlock;
  readonly first: number;
  readonly second: number;
}

/**
 * Flow of the first frames from votes, before a single link is made. In every flow cell (2.5 spacings wide)
 * all displacements between detections of successive frames that are at most two spacings long vote for a
 * velocity; true displacements agree, chance ones spread evenly. The densest place of the votes is the flow of
 * the cell; then the field is refined by votes against the field interpolated at each particle, with a narrower
 * kernel, which resolves gradients that the first round smears out.
 *
 * Cost: about 13 votes a particle and pair in the plane (34 in space), times rounds + 1.
 */
export async function voteFlow(
  pairs: readonly FramePair[],
  options: VoteOptions,
  context: RunContext,
): Promise<FlowGrid> {
  const edge = 2.5 * options.spacing;
  let field = FlowGrid.empty(options.dims, options.box, edge);
  const coarse = new VoteTable(field, options, KERNEL_COARSE);
  for (const pair of pairs) {
    coarse.add(pair, null);
    await context.breathe();
  }
  await coarse.teach(field, context);
  for (let round = 0; round < REFINEMENTS; round++) {
    const fine = new VoteTable(field, options, round === 0 ? KERNEL_COARSE : KERNEL_FINE);
    for (const pair of pairs) {
      fine.add(pair, field);
      await context.breathe();
    }
    const next = FlowGrid.empty(options.dims, options.box, edge);
    await fine.teach(next, context);
    field = next;
  }
  return field;
}

const VOTE_COLUMNS = ['u', 'v', 'w', 'middleX', 'middleY', 'middleZ', 'flowU', 'flowV', 'flowW'] as const;

/** Collected votes of every cell: displacement per unit time, as lists in compressed rows built in two steps. */
class VoteTable {
  private readonly options: VoteOptions;
  private readonly kernel: number;
  private readonly grid: FlowGrid;
  private readonly search = new CellIndex();
  private near = new Int32Array(0);
  private cell = new Int32Array(4096);
  private u = new Float64Array(4096);
  private v = new Float64Array(4096);
  private w = new Float64Array(4096);
  private middleX = new Float64Array(4096);
  private middleY = new Float64Array(4096);
  private middleZ = new Float64Array(4096);
  private flowU = new Float64Array(4096);
  private flowV = new Float64Array(4096);
  private flowW = new Float64Array(4096);
  private votes = 0;
  private steps = 0;
  private stepSum = 0;

  constructor(grid: FlowGrid, options: VoteOptions, kernelInSpacings: number) {
    this.grid = grid;
    this.options = options;
    this.kernel = kernelInSpacings * options.spacing;
  }

  /** Adds the votes of a pair of frames, against `field` where one is given. */
  add(pair: FramePair, field: FlowGrid | null): void {
    const { block, first, second } = pair;
    const { dims, spacing, depthNoise } = this.options;
    const step = block.time[second] - block.time[first];
    const from = block.offsets[second];
    const to = block.offsets[second + 1];
    if (to === from) return;
    const reach = (field === null ? VOTE_REACH : (2 * this.kernel) / spacing) * spacing;
    this.search.build(block, from, to, dims, [reach, reach, reach * (dims === 3 ? depthNoise : 1)]);
    if (this.near.length < to - from) this.near = new Int32Array(to - from);
    const flow = new Float64Array(3);
    this.steps++;
    this.stepSum += step;
    for (let row = block.offsets[first]; row < block.offsets[first + 1]; row++) {
      const x = block.x[row];
      const y = block.y[row];
      const z = dims === 3 ? block.z[row] : 0;
      let px = x;
      let py = y;
      let pz = z;
      if (field !== null) {
        field.at(x, y, z, flow);
        field.at(x + 0.5 * step * flow[0], y + 0.5 * step * flow[1], z + 0.5 * step * flow[2], flow);
        px += step * flow[0];
        py += step * flow[1];
        pz += step * flow[2];
      }
      const found = this.search.near(px, py, pz, this.near);
      this.reserve(found);
      for (let n = 0; n < found; n++) {
        const other = this.near[n];
        const at = this.votes++;
        // Votes belong to the middle of the displacement; in a refinement they are what is left over.
        const ox = block.x[other];
        const oy = block.y[other];
        const oz = dims === 3 ? block.z[other] : 0;
        this.middleX[at] = 0.5 * (x + ox);
        this.middleY[at] = 0.5 * (y + oy);
        this.middleZ[at] = 0.5 * (z + oz);
        this.flowU[at] = (ox - x) / step;
        this.flowV[at] = (oy - y) / step;
        this.flowW[at] = (oz - z) / step;
        this.cell[at] = this.grid.cellAt(this.middleX[at], this.middleY[at], this.middleZ[at]);
        this.u[at] = (ox - px) / step;
        this.v[at] = (oy - py) / step;
        this.w[at] = (oz - pz) / step;
      }
    }
  }

  /**
   * Writes to `field` what the votes say: in every cell the votes near the densest velocity (left-over velocity in
   * a refinement), with their places, so that the cell's fit has a gradient.
   */
  async teach(field: FlowGrid, context: RunContext): Promise<void> {
    const depth = this.options.dims === 3 ? 1 / this.options.depthNoise : 1;
    const width = this.kernelSpeed();
    const per = 1 / (width * width);
    for (const { cell, votes } of this.byCell()) {
      await context.breathe();
      const count = votes.length;
      const best = this.densest(votes, count);
      if (best === null) continue;
      for (let b = 0; b < count; b++) {
        const vote = votes[b];
        const du = this.u[vote] - best[0];
        const dv = this.v[vote] - best[1];
        const dw = (this.w[vote] - best[2]) * depth;
        const r = (du * du + dv * dv + dw * dw) * per;
        if (r >= 1) continue;
        field.learnIn(
          cell,
          (1 - r) * (1 - r),
          this.middleX[vote],
          this.middleY[vote],
          this.middleZ[vote],
          this.flowU[vote],
          this.flowV[vote],
          this.flowW[vote],
        );
      }
    }
    field.fit();
  }

  /** Width of the kernel as a velocity. */
  private kernelSpeed(): number {
    return this.kernel / (this.steps > 0 ? this.stepSum / this.steps : 1);
  }

  /** The votes of each cell that has any (numbers into the vote columns). */
  private *byCell(): Generator<{ cell: number; votes: Int32Array }> {
    const { cells } = this.grid;
    const start = new Int32Array(cells + 1);
    for (let n = 0; n < this.votes; n++) start[this.cell[n] + 1]++;
    for (let cell = 0; cell < cells; cell++) start[cell + 1] += start[cell];
    const order = new Int32Array(this.votes);
    const fill = start.slice();
    for (let n = 0; n < this.votes; n++) order[fill[this.cell[n]]++] = n;
    for (let cell = 0; cell < cells; cell++) {
      const count = start[cell + 1] - start[cell];
      if (count > 0) yield { cell, votes: order.subarray(start[cell], start[cell + 1]) };
    }
  }

  /**
   * Densest velocity among votes: [u, v, w, votes in the kernel], null where no place gathers enough. Every vote
   * is tried as a centre with the kernel (1 - r^2)^2, the best is then moved to the mean under the kernel.
   */
  private densest(votes: Int32Array, count: number): [number, number, number, number] | null {
    const { u, v, w } = this;
    const depth = this.options.dims === 3 ? 1 / this.options.depthNoise : 1;
    const width = this.kernelSpeed();
    const per = 1 / (width * width);
    const longest = (width * VOTE_REACH * this.options.spacing) / this.kernel;
    const perLongest = 1 / (longest * longest);
    // Votes in order of u: only those within one kernel width along u need to be looked at.
    votes.sort((a, b) => u[a] - u[b]);
    const stride = Math.max(1, Math.trunc(count / MOST_CENTRES));
    let best = -1;
    let most = 0;
    let low = 0;
    let high = 0;
    for (let a = 0; a < count; a += stride) {
      const centre = votes[a];
      while (u[votes[low]] < u[centre] - width) low++;
      while (high < count && u[votes[high]] <= u[centre] + width) high++;
      let sum = 0;
      for (let b = low; b < high; b++) {
        const vote = votes[b];
        const du = u[vote] - u[centre];
        const dv = v[vote] - v[centre];
        const dw = (w[vote] - w[centre]) * depth;
        const r = (du * du + dv * dv + dw * dw) * per;
        if (r < 1) sum += (1 - r) * (1 - r);
      }
      const length = u[centre] * u[centre] + v[centre] * v[centre] + w[centre] * depth * (w[centre] * depth);
      sum *= 1 - LONG_VOTE_DISCOUNT * length * perLongest;
      if (sum > most) {
        most = sum;
        best = centre;
      }
    }
    if (best === -1) return null;
    let cu = u[best];
    let cv = v[best];
    let cw = w[best];
    let weight = 0;
    for (let turn = 0; turn < MEAN_SHIFTS; turn++) {
      let su = 0;
      let sv = 0;
      let sw = 0;
      weight = 0;
      for (let b = 0; b < count; b++) {
        const vote = votes[b];
        const du = u[vote] - cu;
        const dv = v[vote] - cv;
        const dw = w[vote] - cw;
        const r = (du * du + dv * dv + dw * depth * (dw * depth)) * per;
        if (r >= 1) continue;
        const part = (1 - r) * (1 - r);
        weight += part;
        su += part * du;
        sv += part * dv;
        sw += part * dw;
      }
      cu += su / weight;
      cv += sv / weight;
      cw += sw / weight;
    }
    return weight < FEWEST_VOTES ? null : [cu, cv, cw, weight];
  }

  private reserve(more: number): void {
    if (this.votes + more <= this.cell.length) return;
    const size = (this.votes + more) * 2;
    const cell = new Int32Array(size);
    cell.set(this.cell);
    this.cell = cell;
    for (const name of VOTE_COLUMNS) {
      const column = new Float64Array(size);
      column.set(this[name]);
      this[name] = column;
    }
  }
}
