import { fileURLToPath } from 'node:url';
import { describe, expect, it } from 'vitest';
import { barAt } from '../../bench/linking/bars';
import { USUAL } from '../../bench/linking/cases';
import { madeTruth } from '../../bench/linking/made-truth';
import { measureCase, measureOurs } from '../../bench/linking/measure-case';

/**
 * A small part of the linking table, whole in tests/long and bench/linking: flows that carry, stir and swirl, at
 * displacement ratios up to 1, against the bars of the whole table. 1000 particles in the middle quarter of the view
 * (eighth of the volume, half of the sides) are as dense as 4000 in the whole, or denser; 40 frames instead of 60.
 */
const PLACES = { root: fileURLToPath(new URL('../..', import.meta.url)), cache: null };
const PART = { ...USUAL, perFrame: 1000, side: 0.5, frames: 40, seed: 7 };
const ROWS = ['street', 'cellular', 'random', 'burgers'].flatMap((flow) =>
  [0.3, 0.6, 1].map((ratio) => [flow, ratio] as const),
);

/** A share of `count` trials that a linker exactly at the bar falls short of once in 30 000 times (4 deviations). */
function leastOf(bar: number, count: number): number {
  return bar - 4 * Math.sqrt((bar * (1 - bar)) / count);
}

describe('links against known truth', () => {
  it.each(ROWS)('%s at displacement ratio %d', async (flow, ratio) => {
    const one = { ...PART, flow, ratio };
    const { ours } = await measureOurs(one, await madeTruth(one, PLACES));
    const { must } = barAt(flow, ratio);
    expect(ours.true).toBeGreaterThan(25_000);
    expect(ours.precision).toBeGreaterThanOrEqual(leastOf(must!.precision, ours.made));
    expect(ours.recall).toBeGreaterThanOrEqual(leastOf(must!.recall, ours.true));
  });

  it('the dump at ratio 1 can be linked by who is told the flow, and not to the nearest', async () => {
    const { oracle, nearest } = await measureCase({ ...PART, flow: 'cellular', ratio: 1 }, PLACES);
    expect(oracle.precision).toBeGreaterThan(0.999);
    expect(oracle.recall).toBeGreaterThan(0.999);
    expect(nearest.recall).toBeLessThan(0.2);
  });
});
