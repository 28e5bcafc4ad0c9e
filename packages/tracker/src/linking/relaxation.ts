import type { DetectionBlock, Dims } from '../core/columns.js';
import { CellIndex } from '../math/cell-index.js';
import type { ActivePathlines } from './active-pathlines.js';
import type { FlowGrid } from './flow-grid.js';
import type { FrameLinks } from './frame-links.js';
import { LonePairs } from './lone-pairs.js';
import type { NeighbourFlow } from './neighbour-flow.js';

/** Neighbours within this many spacings support a pair. */
const RADIUS = 2.5;
/** Offsets of neighbours count as like within this many spacings, and more by this share of their distance. */
const LIKE = 0.1;
const LIKE_GROWTH = 0.1;
/** Least support of a pair that is linked, and how many times that of any pair it excludes. */
const SUPPORT = 2;
const MARGIN = 2;
/** Support that is always possible by chance. */
const CHANCE = 0.1;

/**
 * Links detections that are alone where the flow is not known well enough to say which goes where: a pair of detections
 * is right when its neighbours, displaced alike, have pairs too, and wrong pairs rarely find such company (match
 * probability by neighbours: Baek & Lee, Exp. Fluids 22 (1996) 23-32, from memory; here the support is counted, not
 * iterated). Neighbours count by the
 * offset of their pairs from the flow as far as it is known, so that known gradients are taken out.
 */
export class Relaxation {
  private readonly pairs: LonePairs;
  private readonly index = new CellIndex();
  private readonly spacing: number;
  private readonly dims: Dims;
  private readonly depth: number;
  private support = new Float64Array(0);
  private bestOfFree = new Float64Array(0);
  private secondOfFree = new Float64Array(0);
  private near = new Int32Array(0);

  /** `spacing`: mean spacing of a frame in link space, `reach`: farthest offset from the flow, length unit. */
  constructor(dims: Dims, spacing: number, reach: number, depthNoise: number) {
    this.dims = dims;
    this.spacing = spacing;
    this.depth = dims === 3 ? 1 / depthNoise : 1;
    this.pairs = new LonePairs(dims, reach, depthNoise);
  }

  /** Adds links of at most the risk `limit` to `links` and returns how many. Other arguments as of `LonePairs.collect`. */
  link(
    limit: number,
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
  ): number {
    const { pairs } = this;
    pairs.collect(active, block, from, time, links, anew, near, wide, before, picture);
    if (pairs.lone === 0) return 0;
    this.reserve();
    this.gatherSupport();
    return this.accept(links, limit);
  }

  private gatherSupport(): void {
    const { pairs, support, spacing, dims, depth, near } = this;
    const { lone, x, y, z, start, other, offX, offY, offZ } = pairs;
    const radius = RADIUS * spacing;
    const perSquare = 1 / (radius * radius);
    this.index.build(pairs, 0, lone, dims, [radius, radius, radius / depth]);
    support.fill(0, 0, pairs.pairs);
    for (let b = 0; b < lone; b++) {
      const found = this.index.near(x[b], y[b], z[b], near);
      for (let n = 0; n < found; n++) {
        const neighbour = near[n];
        if (neighbour === b) continue;
        const dx = x[neighbour] - x[b];
        const dy = y[neighbour] - y[b];
        const dz = dims === 3 ? (z[neighbour] - z[b]) * depth : 0;
        const square = dx * dx + dy * dy + dz * dz;
        const tolerance = LIKE * spacing + LIKE_GROWTH * Math.sqrt(square);
        const per = 1 / (tolerance * tolerance);
        const share = 1 - square * perSquare;
        for (let p = start[b]; p < start[b + 1]; p++) {
          // A neighbour speaks once, for the likest of its pairs.
          let likest = 0;
          for (let q = start[neighbour]; q < start[neighbour + 1]; q++) {
            if (other[q] === other[p]) continue;
            const ox = offX[p] - offX[q];
            const oy = offY[p] - offY[q];
            const oz = offZ[p] - offZ[q];
            const like = 1 - (ox * ox + oy * oy + oz * oz) * per;
            if (like > likest) likest = like;
          }
          support[p] += share * likest;
        }
      }
    }
  }

  private accept(links: FrameLinks, limit: number): number {
    const { pairs, support, bestOfFree, secondOfFree } = this;
    const { lone, free, start, other, entry, column } = pairs;
    bestOfFree.fill(0, 0, free);
    secondOfFree.fill(0, 0, free);
    for (let p = 0; p < pairs.pairs; p++) {
      const c = other[p];
      if (support[p] > bestOfFree[c]) {
        secondOfFree[c] = bestOfFree[c];
        bestOfFree[c] = support[p];
      } else if (support[p] > secondOfFree[c]) secondOfFree[c] = support[p];
    }
    let accepted = 0;
    for (let b = 0; b < lone; b++) {
      let best = start[b];
      let second = 0;
      for (let p = start[b] + 1; p < start[b + 1]; p++) {
        if (support[p] > support[best]) {
          second = support[best];
          best = p;
        } else if (support[p] > second) second = support[p];
      }
      const own = support[best];
      const c = other[best];
      const rival = Math.max(second, secondOfFree[c]);
      if (own < SUPPORT || own !== bestOfFree[c] || own < MARGIN * rival) continue;
      const risk = (second + secondOfFree[c] + CHANCE) / (own * own);
      if (risk > limit) continue;
      links.link(entry[b], column[c], risk);
      links.relaxed[column[c]] = 1;
      accepted++;
    }
    return accepted;
  }

  private reserve(): void {
    const { pairs } = this;
    if (this.support.length < pairs.pairs) this.support = new Float64Array(pairs.pairs * 2);
    if (this.bestOfFree.length < pairs.free) {
      this.bestOfFree = new Float64Array(pairs.free * 2);
      this.secondOfFree = new Float64Array(pairs.free * 2);
    }
    if (this.near.length < pairs.lone) this.near = new Int32Array(pairs.lone * 2);
  }
}
