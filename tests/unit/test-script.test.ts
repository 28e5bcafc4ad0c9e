import { describe, expect, it } from 'vitest';
import { countReport, summaryLine } from '../../scripts/test.mjs';

const report = {
  testResults: [
    {
      name: 'a.test.ts',
      status: 'passed',
      assertionResults: [{ status: 'passed' }, { status: 'pending', fullName: 'needs a browser' }],
    },
    { name: 'b.test.ts', status: 'failed', assertionResults: [{ status: 'failed' }, { status: 'passed' }] },
    { name: 'c.test.ts', status: 'failed', assertionResults: [] },
  ],
};

describe('counts of a test report', () => {
  it('counts a file that fails before its tests as a failure', () => {
    expect(countReport(report, false)).toEqual({
      passed: 2,
      failed: 2,
      skipped: 1,
      reasons: ['failed as a whole: c.test.ts'],
    });
  });

  it('counts skipped tests as failures when all are required', () => {
    const counts = countReport(report, true);
    expect(counts.failed).toBe(3);
    expect(counts.reasons).toContain('skipped with REQUIRE_ALL=1: needs a browser');
  });

  it('ends in one plain line', () => {
    expect(summaryLine({ passed: 12, failed: 0, skipped: 0 })).toBe('12 passed, 0 failed');
    expect(summaryLine({ passed: 12, failed: 1, skipped: 2 })).toBe('12 passed, 1 failed, 2 skipped');
  });
});
