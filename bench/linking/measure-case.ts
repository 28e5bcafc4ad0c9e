import { linkBlock } from '../../tests/helpers/link-block';
import { FEWEST, joinedBefore, type LinkScore, scoreLinks } from '../../tests/helpers/score-links';
import { BRIDGE, DEPTH_NOISE, type LinkingCase } from './cases';
import { type MadeTruth, madeTruth, PAIRS_APART, TRUTH_SOURCES } from './made-truth';
import { linkToNearest } from './nearest-linker';
import { addLinks, emptyPool, type RiskPool } from './risk-pool';
import { linkByTrueFlow } from './true-flow-linker';
import { cached, type Places } from './truth-cache';

/** How one linker did. */
export interface CaseScore extends LinkScore {
  /** Wrong and missed links per true link. */
  readonly errors: number;
}

export interface CaseResult {
  readonly case: LinkingCase;
  readonly detections: number;
  readonly ours: CaseScore;
  readonly oracle: CaseScore;
  readonly nearest: CaseScore;
  /** Our links by their stated risk. */
  readonly risk: RiskPool;
  /** Making the dump; our first look and linking. */
  readonly truthSeconds: number;
  readonly linkSeconds: number;
}

/** Sources that the two other linkers are made of, beside those of the truth. */
const OTHERS = [
  'bench/linking/cases.ts',
  'bench/linking/true-flow-linker.ts',
  'bench/linking/nearest-linker.ts',
  'bench/linking/measure-case.ts',
  'tests/helpers/truth.ts',
  'tests/helpers/score-links.ts',
  'packages/tracker/src/linking/assign-exact.ts',
  'packages/tracker/src/linking/assign-quick.ts',
  'packages/tracker/src/linking/candidates.ts',
  'packages/tracker/src/math/assignment.ts',
  'packages/tracker/src/math/cell-index.ts',
];

/** Links the dump of one case with the linker at its default settings, with the true flow, and to the nearest. */
export async function measureCase(one: LinkingCase, places: Places): Promise<CaseResult> {
  const start = performance.now();
  const truth = await madeTruth(one, places);
  const truthSeconds = (performance.now() - start) / 1000;
  const ours = await measureOurs(one, truth);
  const { care: _ours, ...same } = one;
  const others = cached(places, { oracleAndNearest: same }, [...TRUTH_SOURCES, ...OTHERS], () => {
    const { block, flow, noise, oracleSteps: steps, spacing } = truth;
    const { bridge } = rulesOf(one);
    const oracle = scored(one, truth, linkByTrueFlow(block, { flow, noise, steps, bridge, depthNoise: DEPTH_NOISE }));
    const nearest = scored(one, truth, linkToNearest(block, 0.5 * spacing, bridge));
    const counts = ({ made, right, true: all }: CaseScore) => Int32Array.of(made, right, all);
    return { oracle: counts(oracle), nearest: counts(nearest) };
  });
  return {
    case: one,
    detections: truth.particle.length,
    ...ours,
    oracle: fromCounts(others.oracle),
    nearest: fromCounts(others.nearest),
    truthSeconds,
  };
}

/** The linker alone on a dump that is made: its score, its links by their stated risk, its time. */
export async function measureOurs(
  one: LinkingCase,
  truth: MadeTruth,
): Promise<Pick<CaseResult, 'ours' | 'risk' | 'linkSeconds'>> {
  const { block, particle, frame } = truth;
  const care: Record<string, string> = one.care === 'default' ? {} : { care: one.care };
  const start = performance.now();
  const linked = await linkBlock(block, { ...clockOf(one, truth), ...care });
  const linkSeconds = (performance.now() - start) / 1000;
  const { fewest, bridge } = rulesOf(one);
  const risk = emptyPool();
  const trueLinks = joinedBefore(particle, frame, fewest, bridge + 1);
  addLinks(risk, joinedBefore(linked.pathline, frame, fewest), trueLinks, linked.risk);
  return { ours: scored(one, truth, linked.pathline), risk, linkSeconds };
}

/** What counts as a link: no pathline of image pairs has more than two samples, and none crosses a frame. */
function rulesOf({ pairs }: LinkingCase): { fewest: number; bridge: number } {
  return pairs ? { fewest: 2, bridge: 0 } : { fewest: FEWEST, bridge: BRIDGE };
}

function scored(one: LinkingCase, { particle, frame }: MadeTruth, pathline: Int32Array): CaseScore {
  const { fewest, bridge } = rulesOf(one);
  return withErrors(scoreLinks(pathline, particle, frame, bridge, fewest));
}

/** Options of a run with the clock and the scale of the case. */
function clockOf(one: LinkingCase, { rate, scale }: MadeTruth): Record<string, string> {
  const common = { scale: `${scale} mm/px` };
  return one.pairs
    ? { ...common, 'pair-delay': `${1 / rate} s`, 'pair-rate': `${rate / PAIRS_APART} Hz` }
    : { ...common, rate: `${rate} Hz` };
}

function withErrors(score: LinkScore): CaseScore {
  return { ...score, errors: (score.made + score.true - 2 * score.right) / score.true };
}

function fromCounts(counts: ArrayLike<number>): CaseScore {
  const [made, right, all] = [counts[0], counts[1], counts[2]];
  return withErrors({ made, right, true: all, precision: made === 0 ? 1 : right / made, recall: right / all });
}
