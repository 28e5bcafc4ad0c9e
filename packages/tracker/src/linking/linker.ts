import type { DetectionBlock, Dims } from '../core/columns.js';
import type { NeighbourSearch } from '../math/neighbour-search.js';
import { ActivePathlines } from './active-pathlines.js';
import { CandidateSearch } from './candidate-search.js';
import type { FlowGrid, FlowGridData } from './flow-grid.js';
import { FrameLinks, NONE } from './frame-links.js';
import { beginPathline, growPathline } from './grow-pathline.js';
import { LastStep } from './last-step.js';
import { LinkRound } from './link-round.js';
import { NeighbourFlow } from './neighbour-flow.js';
import { type Prediction, Predictors } from './predictors.js';
import { Presence } from './presence.js';
import { Relaxation } from './relaxation.js';

/** Share of the picture kept from frame to frame: it holds what is steady. */
const PICTURE_KEEP = 0.88;
/** Share of the count of strays kept from frame to frame. */
const STRAY_KEEP = 0.95;
/** Risk up to which a link stands after its first round, takes part in the flow of its interval, and tells how good predictions are. */
const SURE_RISK = 4e-4;
const TEACHING_RISK = 0.06;
const LEARNING_RISK = 0.06;
/** Rounds at most; after the second only where more than this share of predictions had no neighbours to go by. */
const ROUNDS = 3;
const UNSUPPORTED_SHARE = 0.02;
/** Radius of the flow of an interval in spacings: about 36 neighbours in the plane, 45 in space. */
const RADIUS = { 2: 3.4, 3: 2.2 } as const;
/** Rounds of relaxation among lone detections: each reaches about two spacings into what is unknown. */
const RELAXATIONS = 2;

/** The flow is lost where fewer than this share of the usual pathlines find a detection, of at least so many. */
const BROKEN_SHARE = 0.5;
const FEWEST_PROVEN = 12;

/** What a linker works with. */
export interface LinkerOptions {
  readonly dims: Dims;
  /** How far from its prediction a detection may lie, length unit, in plane; depth is this times `depthNoise`. */
  readonly reach: number;
  /** How far from the flow about it a lone detection's link may lead, length unit, in plane. */
  readonly loneReach: number;
  /** The same where the flow is lost altogether. */
  readonly lostReach: number;
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
  /** Image pairs: no pathline ever gets older than two detections. */
  readonly pairs: boolean;
  /** First picture of the flow; the linker goes on with it. */
  readonly picture: FlowGrid;
  readonly search: NeighbourSearch;
}

/** What one linker hands on to another: pictures of the flow and records of how it went. */
export interface LinkKnowledge {
  readonly flow: FlowGridData;
  readonly interval: readonly Float64Array[];
  readonly predictors: readonly Float64Array[];
  readonly presence: Float64Array;
  readonly strays: readonly [number, number];
}

/** What the linker counted. */
export interface LinkTally {
  links: number;
  bridging: number;
  leftOutForRisk: number;
  pathlines: number;
}

/**
 * Links frame after frame. A frame is linked in rounds from sure to unsure: proven pathlines first, by what is cheap to
 * tell; their links show the flow of this very interval, which predicts all that is left; detections that are still
 * alone are linked by what their neighbours do. State is one entry for each pathline in view, the flow of the last
 * interval, a coarse long picture of the flow and the record of earlier surprises: memory does not grow with the number
 * of frames. Uses only + - * / and sqrt.
 */
export class Linker {
  readonly tally: LinkTally = { links: 0, bridging: 0, leftOutForRisk: 0, pathlines: 0 };
  private readonly options: LinkerOptions;
  private readonly depth: number;
  private readonly predictors: Predictors;
  private readonly search: CandidateSearch;
  private readonly round = new LinkRound();
  private readonly links = new FrameLinks();
  private readonly presence = new Presence();
  private readonly relaxation: Relaxation;
  private readonly lost: Relaxation;
  private readonly step = new LastStep();
  private readonly prediction: Prediction = { x: 0, y: 0, z: 0, expected: 0, widest: 0 };
  /** Flow of this interval, of the one before, and of this one about twice as far. */
  private now: NeighbourFlow;
  private before: NeighbourFlow;
  private readonly wide: NeighbourFlow;
  private active = new ActivePathlines();
  private spare = new ActivePathlines();
  private entries = new Int32Array(0);
  private nextId = 0;
  private segment = Number.NaN;
  private lastNumber = 0;
  /** The flow of the interval before serves at the start of the next segment. */
  private keepBefore = false;
  private straySum = 0;
  private strayWeight = 0;

  constructor(options: LinkerOptions) {
    this.options = options;
    const { dims, reach, depthNoise, density, noiseSquare } = options;
    this.depth = dims === 3 ? 1 / depthNoise : 1;
    this.search = new CandidateSearch(dims, reach, depthNoise, options.search);
    const spacing = dims === 2 ? 1 / Math.sqrt(density) : 1 / Math.cbrt(density);
    const radius = RADIUS[dims] * spacing;
    this.now = new NeighbourFlow(dims, radius, depthNoise);
    this.before = new NeighbourFlow(dims, radius, depthNoise);
    this.wide = new NeighbourFlow(dims, 2 * radius, depthNoise);
    this.relaxation = new Relaxation(dims, spacing, options.loneReach, depthNoise);
    this.lost = new Relaxation(dims, spacing, options.lostReach, depthNoise);
    const start = Math.max(options.expected, noiseSquare);
    const thorough = options.care === 'thorough';
    this.predictors = new Predictors(options.picture, this.before, noiseSquare, start, spacing, thorough);
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
    this.startFrame(block.segment[k], block.number[k]);
    const thorough = this.options.care === 'thorough';
    this.links.begin(this.active.count, to - from);
    this.predictors.begin(this.active.count);
    this.search.begin(block, from, to);
    if (thorough) this.inRounds(block, from, time);
    else this.oneRound(block, from, time, false, true);
    this.settle(block, from, time, pathline, risk);
    if (thorough) this.remember();
  }

  /** What the linker knows, as copies in plain form. */
  knowledge(): LinkKnowledge {
    return {
      flow: this.options.picture.toData(),
      interval: this.before.toData(),
      predictors: this.predictors.toData(),
      presence: this.presence.toData(),
      strays: [this.straySum, this.strayWeight],
    };
  }

  /** Starts with what another has learnt; its picture comes with the options. */
  recall({ interval, predictors, presence, strays }: LinkKnowledge): void {
    this.before.restore(interval);
    this.predictors.restore(predictors);
    this.presence.restore(presence);
    [this.straySum, this.strayWeight] = strays;
    this.keepBefore = true;
  }

  /** Turns time round: what is known of the flow stays, with its velocities reversed; pathlines do not. */
  turnRound(): void {
    this.active.count = 0;
    this.before.turnRound();
    this.options.picture.turnRound();
    this.segment = Number.NaN;
    this.keepBefore = true;
  }

  /** Segments have no pathline in common; frames without any detection do not stand in a block, but count as missed. */
  private startFrame(segment: number, number: number): void {
    if (segment !== this.segment) {
      this.active.count = 0;
      if (!this.keepBefore) this.before.begin(0);
      this.keepBefore = false;
      this.segment = segment;
      this.lastNumber = number;
    }
    const gap = Math.max(0, number - this.lastNumber - 1);
    this.lastNumber = number;
    if (gap > 0) this.skip(gap);
  }

  private inRounds(block: DetectionBlock, from: number, time: number): void {
    const { predictors, links, active } = this;
    if (links.entries === 0) return;
    predictors.now = null;
    predictors.before = this.before;
    this.oneRound(block, from, time, false, false);
    if (this.broken()) this.findAgain(block, from, time);
    for (let round = 1; round < ROUNDS; round++) {
      this.gather(block, from, time);
      this.releaseUnsure();
      predictors.now = this.now;
      predictors.unsupported = 0;
      this.oneRound(block, from, time, true, true);
      if (predictors.unsupported <= UNSUPPORTED_SHARE * links.entries) break;
    }
    this.gather(block, from, time);
    const { riskLimit, picture } = this.options;
    for (let turn = 0; turn < RELAXATIONS; turn++) {
      this.wide.follow(this.now);
      const more = this.relaxation.link(
        riskLimit,
        active,
        block,
        from,
        time,
        links,
        turn > 0,
        this.now,
        this.wide,
        this.before,
        picture,
      );
      if (more === 0) return;
      this.gather(block, from, time);
    }
  }

  /**
   * True when the first round linked far fewer pathlines than usual, chance hits taken off: the flow is not what it was a
   * frame ago. What was linked then is mostly wrong, whatever its risk says.
   */
  private broken(): boolean {
    const { search, links, presence, options } = this;
    const rows = search.candidates.rows;
    if (rows < FEWEST_PROVEN) return false;
    let linked = 0;
    for (let i = 0; i < links.entries; i++) if (links.took[i] >= 0) linked++;
    const chance = Math.min(rows, search.gates * options.density);
    return linked - chance < BROKEN_SHARE * presence.of(2, 0) * (rows - chance);
  }

  /** Drops all links of this frame and makes those that neighbours support, as far as a flow can have changed. */
  private findAgain(block: DetectionBlock, from: number, time: number): void {
    const { links, active, now, wide, before, options } = this;
    for (let i = 0; i < links.entries; i++) links.release(i);
    now.begin(0);
    wide.begin(0);
    const { riskLimit, picture } = options;
    this.lost.link(riskLimit, active, block, from, time, links, false, now, wide, before, picture);
  }

  /** One round over all active pathlines without a link. */
  private oneRound(block: DetectionBlock, from: number, time: number, exact: boolean, final: boolean): void {
    const { active, links, search, options, predictors, prediction, presence } = this;
    if (this.entries.length < active.count) this.entries = new Int32Array(active.count * 2);
    const { entries } = this;
    let count = 0;
    for (let i = 0; i < active.count; i++) {
      if (links.took[i] >= 0) continue;
      links.took[i] = NONE;
      entries[count++] = i;
    }
    search.collect(active, entries, count, block, from, time, links, predictors, prediction, presence);
    const leftOut = this.round.run(search, links, exact, this.strayDensity(), options.riskLimit, final);
    if (final) this.tally.leftOutForRisk += leftOut;
  }

  /** Takes back what may look otherwise in the next round. */
  private releaseUnsure(): void {
    const { links } = this;
    for (let column = 0; column < links.columns; column++) {
      const i = links.takenBy[column];
      if (i !== NONE && links.risk[column] > SURE_RISK) links.release(i);
    }
  }

  /** The flow of this interval from its links so far. */
  private gather(block: DetectionBlock, from: number, time: number): void {
    const { now, active, links, step } = this;
    const { x, y, z } = block;
    const space = this.options.dims === 3;
    now.begin(links.columns);
    for (let column = 0; column < links.columns; column++) {
      const i = links.takenBy[column];
      const risk = links.risk[column];
      if (i === NONE || risk > TEACHING_RISK) continue;
      const row = from + column;
      step.take(active, i, x[row], y[row], space ? z[row] : 0, time);
      now.add(i, step.mx, step.my, step.mz, step.u, step.v, step.w, 1 - risk);
    }
  }

  /** Turns the links into pathlines, starts new ones, carries on those that missed, and learns. */
  private settle(block: DetectionBlock, from: number, time: number, pathline: Int32Array, risk: Float32Array): void {
    const { active, spare, links, options, predictors, tally, depth, step } = this;
    const { dims, picture } = options;
    spare.count = 0;
    spare.reserve(links.columns + active.count);
    predictors.fade();
    picture.fade(PICTURE_KEEP);
    // Only pathlines that have proved themselves teach the picture, unless there are no others.
    const fewest = options.pairs ? 1 : 2;
    let strays = 0;
    for (let column = 0; column < links.columns; column++) {
      const row = from + column;
      const i = links.takenBy[column];
      const x = block.x[row];
      const y = block.y[row];
      const z = dims === 3 ? block.z[row] : 0;
      if (i === NONE) {
        strays++;
        beginPathline(spare, this.nextId, x, y, z, time);
        pathline[row] = this.nextId++;
        risk[row] = 0;
        continue;
      }
      step.take(active, i, x, y, z, time);
      growPathline(active, i, spare, x, y, z, time, step);
      pathline[row] = active.id[i];
      risk[row] = links.risk[column];
      tally.links++;
      if (active.missed[i] > 0) tally.bridging++;
      if (links.risk[column] < LEARNING_RISK && links.relaxed[column] === 0) {
        predictors.countSurprise(i, x - active.px[i], y - active.py[i], (z - active.pz[i]) * depth);
        if (active.missed[i] === 0) predictors.learn(i, x, y, z, depth);
      }
      if (active.age[i] >= fewest) picture.learn(step.mx, step.my, step.mz, step.u, step.v, step.w);
    }
    picture.fit();
    this.carryOn(time);
    this.straySum = this.straySum * STRAY_KEEP + strays;
    this.strayWeight = this.strayWeight * STRAY_KEEP + links.columns;
    tally.pathlines = this.nextId;
    this.active = spare;
    this.spare = active;
  }

  /** Pathlines that missed this frame stay in view while the bridge lasts. */
  private carryOn(time: number): void {
    const { active, spare, links, presence, options } = this;
    for (let i = 0; i < active.count; i++) {
      presence.count(active.age[i], active.missed[i], links.took[i] >= 0);
      if (links.took[i] !== NONE || active.missed[i] >= options.bridge) continue;
      active.miss(i, time);
      spare.carry(active, i);
    }
    presence.fade();
  }

  /** The flow of this interval becomes that of the one before; its links now belong to the columns they led to. */
  private remember(): void {
    const { now, links } = this;
    now.retag(links.took);
    this.now = this.before;
    this.before = now;
  }

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
    this.before.begin(0);
  }

  /** Density of detections that belong to no pathline yet, from the share of late; at least one in a hundred. */
  private strayDensity(): number {
    const share = this.strayWeight > 0 ? this.straySum / this.strayWeight : 0.2;
    return this.options.density * (share < 0.01 ? 0.01 : Math.min(share, 0.5));
  }
}
