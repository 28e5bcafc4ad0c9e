// Everything `npm test` checks, in order: lint and format, import directions, stale generated files, types of the
// tests, the tests themselves. Goes on after a failing step, so that one run shows all that is wrong. The last line is
// `N passed, N failed` (each step before the tests counts as one check); exit 1 on any failure.
import { spawnSync } from 'node:child_process';
import { existsSync, mkdtempSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import { fileURLToPath, pathToFileURL } from 'node:url';

/**
 * Counts of one vitest JSON report. A file that fails before its tests run (a broken import) counts as one failure;
 * with `requireAll` a skipped test is a failure too.
 */
export function countReport(report, requireAll) {
  let passed = 0;
  let failed = 0;
  let skipped = 0;
  const reasons = [];
  for (const file of report.testResults ?? []) {
    let failedHere = 0;
    for (const one of file.assertionResults ?? []) {
      if (one.status === 'passed') passed++;
      else if (one.status === 'failed') {
        failed++;
        failedHere++;
      } else {
        skipped++;
        if (requireAll) reasons.push(`skipped with REQUIRE_ALL=1: ${one.fullName ?? one.title}`);
      }
    }
    if (file.status === 'failed' && failedHere === 0) {
      failed++;
      reasons.push(`failed as a whole: ${file.name}`);
    }
  }
  if (requireAll) failed += skipped;
  return { passed, failed, skipped, reasons };
}

/** The plain last line. */
export function summaryLine({ passed, failed, skipped }) {
  return `${passed} passed, ${failed} failed${skipped > 0 ? `, ${skipped} skipped` : ''}`;
}

function main(extra) {
  const root = dirname(dirname(fileURLToPath(import.meta.url)));
  const requireAll = process.env.REQUIRE_ALL === '1';
  const scratch = mkdtempSync(join(tmpdir(), 'wakeloom-test-'));
  const reportFile = join(scratch, 'vitest.json');
  const bin = (...parts) => join(root, 'node_modules', ...parts);
  const steps = [
    ['lint and format', [bin('@biomejs', 'biome', 'bin', 'biome'), 'check', '.']],
    ['import directions', [join(root, 'scripts', 'check-directions.mjs')]],
    ['generated files', [join(root, 'scripts', 'generate.mjs'), '--check']],
    ['types of the tests', [bin('typescript', 'bin', 'tsc'), '-p', 'tests']],
  ];
  const total = { passed: 0, failed: 0, skipped: 0 };
  const failures = [];
  for (const [name, args] of steps) {
    const status = run(root, name, args);
    if (status === 0) total.passed++;
    else {
      total.failed++;
      failures.push(name);
    }
  }
  const vitest = [bin('vitest', 'vitest.mjs'), 'run', '--reporter=default', '--reporter=json'];
  const status = run(root, 'tests', [...vitest, `--outputFile.json=${reportFile}`, ...extra]);
  if (existsSync(reportFile)) {
    const counts = countReport(JSON.parse(readFileSync(reportFile, 'utf8')), requireAll);
    total.passed += counts.passed;
    total.failed += counts.failed;
    total.skipped += counts.skipped;
    failures.push(...counts.reasons);
    if (counts.failed > 0) failures.push('tests');
    else if (status !== 0) {
      // An unhandled rejection or a crash after the last test leaves all tests green and the exit code red.
      total.failed++;
      failures.push(`tests: the runner ended with ${status} although no single test failed (see above)`);
    }
  } else {
    total.failed++;
    failures.push('tests: the runner left no report');
  }
  rmSync(scratch, { recursive: true, force: true });
  if (!existsSync('/usr/bin/chromium')) {
    console.log('\nChromium is not installed, so the tests in a real browser could not run.');
    console.log('On Debian or Ubuntu: apt-get install chromium (or run .ci/run, which installs all that tests need).');
  }
  if (failures.length > 0) console.log(`\nFailed:\n${failures.map((line) => `  ${line}`).join('\n')}`);
  console.log(`\n${summaryLine(total)}`);
  return total.failed === 0 ? 0 : 1;
}

function run(root, name, args) {
  console.log(`\n== ${name}`);
  const started = performance.now();
  const { status, error } = spawnSync(process.execPath, args, { cwd: root, stdio: 'inherit' });
  if (error !== undefined) console.log(error.message);
  console.log(
    `== ${name}: ${status === 0 ? 'passed' : 'FAILED'} in ${((performance.now() - started) / 1000).toFixed(1)} s`,
  );
  return status ?? 1;
}

if (process.argv[1] !== undefined && import.meta.url === pathToFileURL(process.argv[1]).href) {
  process.exitCode = main(process.argv.slice(2));
}
