import { execFileSync } from 'node:child_process';
import { availableParallelism, cpus, loadavg, totalmem } from 'node:os';
import { fileURLToPath } from 'node:url';

const ROOT = fileURLToPath(new URL('../..', import.meta.url));

/** What the figures depend on: no names of hosts, no paths. */
export function machine() {
  const round = (value) => Math.round(10 * value) / 10;
  return {
    processor: cpus()[0]?.model ?? 'unknown',
    cores: availableParallelism(),
    memoryGigabytes: Math.round(totalmem() / 2 ** 30),
    node: process.version,
    platform: `${process.platform} ${process.arch}`,
    loadBefore: round(loadavg()[0]),
  };
}

/** Short name of the commit that is checked out. */
export function commit() {
  return git('rev-parse', '--short', 'HEAD');
}

/** Whether the sources of the library differ from that commit. */
export function changed() {
  return git('status', '--porcelain', '--', 'packages/tracker/src', 'bench/linking', 'tests/helpers') !== '';
}

function git(...words) {
  return execFileSync('git', words, { cwd: ROOT, encoding: 'utf8' }).trim();
}
