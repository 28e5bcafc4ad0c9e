import { type LinkingCase, PAIRS, unusual } from './cases';
import { flowCase } from './flows';
import type { RiskDecade, RiskSummary } from './risk-pool';

/** What a case is held against. */
export interface Bar {
  /** Least precision and recall; null where the honest figure is all that is asked. */
  readonly must: { readonly precision: number; readonly recall: number } | null;
  /** Aim: errors over those of the linker that is told the flow. */
  readonly timesOracle: number | null;
  /** Aim: precision and recall where no bar stands. */
  readonly aim: { readonly precision: number; readonly recall: number } | null;
}

/** Flows that carry all particles along at about one speed; the others turn or stir them. */
const STREAMS = ['street', 'wake', 'wake-wide', 'channel', 'cylinder'];
const NONE: Bar = { must: null, timesOracle: null, aim: null };

/**
 * The bar of a case: 4000 particles, 60 frames, 5 % losses, 5 % ghosts, noise 0.1 px, default settings. None where
 * something else was changed, and none at the ratios that have none.
 */
export function barOf(one: LinkingCase): Bar {
  if (one.pairs) {
    const stated = unusual({ ...one, pairs: false, frames: 60 }) === '' && one.frames === PAIRS.frames;
    return stated && one.ratio === PAIRS.ratio ? { ...NONE, must: { precision: 0.98, recall: 0.95 } } : NONE;
  }
  if (unusual(one) !== '') return NONE;
  return barAt(one.flow, one.ratio);
}

/** The bar of a flow at a displacement ratio. */
export function barAt(flow: string, ratio: number): Bar {
  flowCase(flow);
  if (ratio === 0.3) return { must: { precision: 0.998, recall: 0.995 }, timesOracle: 2, aim: null };
  if (ratio === 0.6) return { must: { precision: 0.995, recall: 0.98 }, timesOracle: 3, aim: null };
  if (ratio === 1) {
    const must = STREAMS.includes(flow) ? { precision: 0.99, recall: 0.95 } : { precision: 0.98, recall: 0.9 };
    return { must, timesOracle: 3, aim: null };
  }
  if (ratio === 1.5) return { ...NONE, aim: { precision: 0.98, recall: 0.93 } };
  return NONE;
}

/** Bars of the stated link risk. */
export const RISK_BARS = {
  /** A decade is judged where this many wrong links are to be expected. */
  fewestExpected: 100,
  /** Observed over stated wrong links in a decade. */
  least: 0.67,
  most: 1.5,
  /** Area under the curve of wrong links found against right ones blamed, by stated risk. */
  areaUnderCurve: 0.9,
  /** Sum of the stated risks over the number of wrong links: at most this far from 1. */
  sumOff: 0.15,
} as const;

/** A decade with what its bar says. */
export interface JudgedDecade extends RiskDecade {
  readonly verdict: 'met' | 'missed' | 'not judged';
}

/** The link risk with what its bars say: `misses` in words, empty where all holds. */
export interface JudgedRisk extends RiskSummary {
  readonly decades: readonly JudgedDecade[];
  readonly misses: readonly string[];
}

/** Holds the link risk against its bars. */
export function judgeRisk(summary: RiskSummary): JudgedRisk {
  const { areaUnderCurve, expected, wrong } = summary;
  const decades = summary.decades.map((decade) => ({ ...decade, verdict: judgeDecade(decade) }));
  const misses = decades
    .filter(({ verdict }) => verdict === 'missed')
    .map(({ from, to, ...counts }) => {
      const ratio = (counts.wrong / counts.expected).toFixed(2);
      return `stated risk ${from.toExponential(0)} to ${to.toExponential(0)}: observed over stated ${ratio}`;
    });
  if (!(areaUnderCurve >= RISK_BARS.areaUnderCurve)) misses.push(`area under the curve ${areaUnderCurve.toFixed(3)}`);
  if (!(Math.abs(expected / wrong - 1) <= RISK_BARS.sumOff)) {
    misses.push(`sum of risks over wrong links ${(expected / wrong).toFixed(2)}`);
  }
  return { ...summary, decades, misses };
}

function judgeDecade({ expected, wrong }: RiskDecade): JudgedDecade['verdict'] {
  if (expected < RISK_BARS.fewestExpected) return 'not judged';
  const ratio = wrong / expected;
  return ratio >= RISK_BARS.least && ratio <= RISK_BARS.most ? 'met' : 'missed';
}
