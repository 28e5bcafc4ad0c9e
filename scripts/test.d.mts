export interface TestCounts {
  readonly passed: number;
  readonly failed: number;
  readonly skipped: number;
}
export function countReport(report: unknown, requireAll: boolean): TestCounts & { readonly reasons: string[] };
export function summaryLine(counts: TestCounts): string;
