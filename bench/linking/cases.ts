import { FLOW_CASES, flowCase } from './flows';

/** One dump to link. */
export interface LinkingCase {
  readonly flow: string;
  /** Mean displacement a frame interval over the mean spacing n^(-1/D) of the particles. */
  readonly ratio: number;
  /** Standard deviation of position noise in the plane, px of 1280 a width; along z three times as much. */
  readonly noise: number;
  readonly losses: number;
  readonly ghosts: number;
  readonly perFrame: number;
  readonly frames: number;
  readonly seed: number;
  /** Image pairs: `frames` is twice their number. */
  readonly pairs: boolean;
  /** Side of the part that is looked at over that of the view, same px: fewer particles resolve as much. */
  readonly side: number;
  /** Care of the linker; `default` leaves the setting alone. */
  readonly care: 'quick' | 'thorough' | 'default';
}

/** What the bars of linking are stated for. */
export const USUAL: Omit<LinkingCase, 'flow' | 'ratio' | 'seed'> = {
  noise: 0.1,
  losses: 0.05,
  ghosts: 0.05,
  perFrame: 4000,
  frames: 60,
  pairs: false,
  side: 1,
  care: 'default',
};

/** Noise along the line of sight over that in the plane. */
export const DEPTH_NOISE = 3;
/** Missing frames that a link may cross; the default of the setting. */
export const BRIDGE = 2;

/** Displacement ratios of the table, in the plane and in space. */
export const RATIOS = { 2: [0.1, 0.3, 0.6, 1, 1.5], 3: [0.3, 0.6, 1] } as const;
/** Ratio of the image pairs, and the flows they are made of. */
export const PAIRS = { ratio: 0.6, flows: ['wake', 'cellular'], frames: 200 } as const;
const SEEDS = [1, 2];
/** Set aside: looked at once, when the linker is done. */
const HELD_OUT_SEEDS = [1001, 1002];

/** One thing changed at a time, at two ratios. */
const CROSS_RATIOS = [0.3, 1];
const CROSS: readonly Partial<LinkingCase>[] = [
  { noise: 0.05 },
  { noise: 0.2 },
  { noise: 0.3 },
  { losses: 0 },
  { losses: 0.15 },
  { ghosts: 0 },
  { ghosts: 0.2 },
  { perFrame: 1000 },
  { perFrame: 10_000 },
  { perFrame: 20_000 },
];

/** Names of all flows. */
export const ALL_FLOWS: readonly string[] = FLOW_CASES.map(({ name }) => name);
/** Sets of cases by name. */
export const SET_NAMES = ['quick', 'table', 'full', 'held-out'] as const;
export type SetName = (typeof SET_NAMES)[number];

/** The cases of a set: `table` is every flow at every ratio; `full` adds what is changed one at a time, and image pairs. */
export function casesOf(set: SetName): LinkingCase[] {
  if (set === 'quick') {
    const flows = ['street', 'cellular', 'random', 'burgers'];
    return flows.flatMap((flow) => [0.3, 1].map((ratio) => ({ ...USUAL, flow, ratio, seed: SEEDS[0] })));
  }
  if (set === 'table') return table(SEEDS);
  if (set === 'held-out') return [...table(HELD_OUT_SEEDS), ...imagePairs(HELD_OUT_SEEDS)];
  return [...table(SEEDS), ...imagePairs(SEEDS), ...cross()];
}

function table(seeds: readonly number[]): LinkingCase[] {
  return ALL_FLOWS.flatMap((flow) =>
    RATIOS[flowCase(flow).dims].flatMap((ratio) => seeds.map((seed) => ({ ...USUAL, flow, ratio, seed }))),
  );
}

function cross(): LinkingCase[] {
  return ALL_FLOWS.flatMap((flow) =>
    CROSS_RATIOS.flatMap((ratio) => CROSS.map((change) => ({ ...USUAL, flow, ratio, seed: SEEDS[0], ...change }))),
  );
}

function imagePairs(seeds: readonly number[]): LinkingCase[] {
  const { ratio, frames } = PAIRS;
  return PAIRS.flows.flatMap((flow) => seeds.map((seed) => ({ ...USUAL, flow, ratio, frames, pairs: true, seed })));
}

const percent = (share: number) => `${+(100 * share).toFixed(3)} %`;
/** What each field of a case is called where it is not as usual. */
const WORDS: { readonly [Name in keyof typeof USUAL]: (one: LinkingCase) => string } = {
  noise: ({ noise }) => `noise ${noise} px`,
  losses: ({ losses }) => `${percent(losses)} lost`,
  ghosts: ({ ghosts }) => `${percent(ghosts)} false`,
  perFrame: ({ perFrame }) => `${perFrame} a frame`,
  frames: ({ frames, pairs }) => (pairs ? '' : `${frames} frames`),
  pairs: ({ frames }) => `${frames / 2} pairs`,
  side: ({ side }) => `${percent(side)} of the sides`,
  care: ({ care }) => care,
};

/** What of a case is not as usual, `noise 0.2 px` and the like; empty where all is. */
export function unusual(one: LinkingCase): string {
  const names = Object.keys(USUAL) as (keyof typeof USUAL)[];
  const words = names.filter((name) => one[name] !== USUAL[name]).map((name) => WORDS[name](one));
  return words.filter((word) => word !== '').join(', ');
}

/** Short name for progress lines and messages. */
export function caseName(one: LinkingCase): string {
  const more = unusual(one);
  return `${one.flow}, ratio ${one.ratio}, seed ${one.seed}${more === '' ? '' : `, ${more}`}`;
}
