import { spawn } from 'node:child_process';
import { once } from 'node:events';
import { mkdtempSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { barAt, barOf, RISK_BARS } from '../../bench/linking/bars';
import { casesOf, type LinkingCase, PAIRS } from '../../bench/linking/cases';
import type { CaseResult } from '../../bench/linking/measure-case';
import type { RiskSummary } from '../../bench/linking/risk-pool';

/**
 * The whole linking table and the link risk pooled over the harness, as `npm run bench:linking -- --set full` measures
 * them: every dump that has a bar against it, of every seed. About half an hour on two cores.
 */
const HARNESS = fileURLToPath(new URL('../../bench/linking/run.mjs', import.meta.url));
const LONGEST = 80 * 60_000;
const BARRED = casesOf('full').filter((one) => barOf(one).must !== null);
const ROWS = [...new Set(BARRED.filter(({ pairs }) => !pairs).map(({ flow, ratio }) => `${flow} ${ratio}`))].map(
  (name) => [name.split(' ')[0], Number(name.split(' ')[1])] as const,
);

interface Figures {
  readonly cases: readonly (Omit<CaseResult, 'risk'> & { readonly risk: RiskSummary })[];
  readonly failed: readonly { readonly case: LinkingCase; readonly error: string }[];
  readonly risk: RiskSummary;
}

const folder = mkdtempSync(join(tmpdir(), 'wakeloom-linking-'));
let record: Figures;

beforeAll(async () => {
  const out = join(folder, 'full.json');
  const harness = spawn(process.execPath, [HARNESS, '--set', 'full', '--out', out], { stdio: 'inherit' });
  const [code, signal] = await once(harness, 'exit');
  // 1: a case failed, which the first test below shows.
  if (code !== 0 && code !== 1) throw new Error(`the harness ended with ${signal ?? code}`);
  record = JSON.parse(readFileSync(out, 'utf8')) as Figures;
}, LONGEST);
afterAll(() => rmSync(folder, { recursive: true }));

/** Results of one flow and ratio under the usual conditions, or of image pairs. */
function resultsOf(flow: string, ratio: number, pairs: boolean) {
  const wanted = BARRED.filter((one) => one.flow === flow && one.ratio === ratio && one.pairs === pairs);
  return wanted.map((one) => {
    const found = record.cases.find((result) => JSON.stringify(result.case) === JSON.stringify(one));
    if (found === undefined) throw new Error(`no figures of ${JSON.stringify(one)}`);
    return found;
  });
}

describe('links against known truth', () => {
  it('every dump of the full set is linked', () => {
    expect(record.failed).toEqual([]);
    expect(record.cases).toHaveLength(casesOf('full').length);
  });

  it.each(ROWS)('%s at displacement ratio %d', (flow, ratio) => {
    const { must } = barAt(flow, ratio);
    const results = resultsOf(flow, ratio, false);
    expect(results).toHaveLength(2);
    for (const { ours } of results) {
      expect(ours.true).toBeGreaterThan(100_000);
      expect(ours.precision).toBeGreaterThanOrEqual(must!.precision);
      expect(ours.recall).toBeGreaterThanOrEqual(must!.recall);
    }
  });

  it.each(PAIRS.flows)('image pairs, %s', (flow) => {
    for (const { ours } of resultsOf(flow, PAIRS.ratio, true)) {
      expect(ours.true).toBeGreaterThan(300_000);
      expect(ours.precision).toBeGreaterThanOrEqual(0.98);
      expect(ours.recall).toBeGreaterThanOrEqual(0.95);
    }
  });
});

describe('link risk, pooled over the harness', () => {
  it('is what is observed, in every decade with enough wrong links to expect', () => {
    const judged = record.risk.decades.filter(({ expected }) => expected >= RISK_BARS.fewestExpected);
    expect(judged.length).toBeGreaterThan(0);
    for (const { wrong, expected } of judged) {
      expect(wrong / expected).toBeGreaterThanOrEqual(0.67);
      expect(wrong / expected).toBeLessThanOrEqual(1.5);
    }
  });

  it('tells wrong links from right ones', () => {
    expect(record.risk.areaUnderCurve).toBeGreaterThanOrEqual(0.9);
  });

  it('adds up to the number of wrong links', () => {
    expect(Math.abs(record.risk.expected / record.risk.wrong - 1)).toBeLessThanOrEqual(0.15);
  });
});
