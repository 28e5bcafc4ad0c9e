import { CellIndex } from '../math/cell-index.js';
import { KdSearch } from '../math/kd-search.js';
import type { NeighbourSearch } from '../math/neighbour-search.js';
import type { LinkingSettings } from '../run/settings.js';
import { FlowGrid, type FlowGridData } from './flow-grid.js';
import { Linker, type LinkKnowledge } from './linker.js';

/** How far from the flow about it a lone detection's link may lead, in spacings, unless the reach was set. */
const LONE_REACH = 0.8;
/** The same where the flow is lost altogether: as far as the first votes look. */
const LOST_REACH = 2;

/** What linking takes from the first look at the data. */
export interface LinkPrior {
  readonly dims: 2 | 3;
  /** Length unit, in plane. */
  readonly reach: number;
  /** Least expected square of a surprise, length unit squared. */
  readonly noiseSquare: number;
  /** Expected square of a true detection's distance from the first flow picture, length unit squared. */
  readonly expected: number;
  /** Particles per area (volume) of link space. */
  readonly density: number;
  readonly flow: FlowGridData;
  /** What was learnt of the first frames; null: nothing yet. */
  readonly knowledge: LinkKnowledge | null;
  /** Image pairs: no pathline has more than two detections. */
  readonly pairs: boolean;
}

/** The search that a setting names. */
export function searchFor(name: LinkingSettings['search']): NeighbourSearch {
  return name === 'kd-tree' ? new KdSearch() : new CellIndex();
}

/** A linker ready for the first frame. */
export function createLinker(settings: LinkingSettings, prior: LinkPrior): Linker {
  const spacing = 1 / (prior.dims === 2 ? Math.sqrt(prior.density) : Math.cbrt(prior.density));
  const flow = prior.knowledge?.flow ?? prior.flow;
  const linker = new Linker({
    pairs: prior.pairs,
    dims: prior.dims,
    reach: prior.reach,
    loneReach: settings.reach === 'auto' ? LONE_REACH * spacing : prior.reach,
    lostReach: settings.reach === 'auto' ? LOST_REACH * spacing : prior.reach,
    bridge: prior.pairs ? 0 : settings.bridge,
    care: settings.care,
    riskLimit: settings.riskLimit,
    depthNoise: prior.dims === 3 ? settings.depthNoise : 1,
    noiseSquare: prior.noiseSquare,
    expected: prior.expected,
    density: prior.density,
    picture: new FlowGrid({ ...flow, moments: flow.moments.slice() }),
    search: searchFor(settings.search),
  });
  if (prior.knowledge !== null) linker.recall(prior.knowledge);
  return linker;
}
