import { FLOW_CASES } from './flows';

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
  readonly care: 'quick' | 'thorough';
}

/** What the bars of linking are stated for. */
export const USUAL = {
  noise: 0.1,
  losses: 0.05,
  ghosts: 0.05,
  perFrame: 4000,
  frames: 60,
  pairs: false,
  care: 'thorough',
} as const;

/** Noise along the line of sight over that in the plane. */
export const DEPTH_NOISE = 3;
/** Missing frames that a link may cross; the default of the setting. */
export const BRIDGE = 2;

/** Short name for progress lines and messages. */
export function caseName(one: LinkingCase): string {
  const differs = (Object.keys(USUAL) as (keyof typeof USUAL)[]).filter((key) => one[key] !== USUAL[key]);
  return [one.flow, `ratio ${one.ratio}`, `seed ${one.seed}`, ...differs.map((key) => `${key} ${one[key]}`)].join(', ');
}

/** Names of all flows. */
export const ALL_FLOWS: readonly string[] = FLOW_CASES.map(({ name }) => name);
