import { execFileSync } from 'node:child_process';
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, describe, expect, it } from 'vitest';
import { needs } from '../helpers/need.js';

interface Outcome {
  code: string | null;
  message?: string;
  details?: { path?: string; needBytes?: number };
  files: string[];
  complete: boolean;
}

const disk = mkdtempSync(join(tmpdir(), 'disk-full-'));
afterAll(() => rmSync(disk, { recursive: true, force: true }));

/**
 * A disk of 20 MB, partly taken by ballast during the first of two runs of 50 000 samples (about 5 MB in scratch files
 * and 7 MB of result).
 */
function twoRuns(manner: 'asked' | 'silent', ballast: number, megabytes = 20): Outcome[] {
  const child = join(import.meta.dirname, '../helpers/fill-disk.mjs');
  const command = `mount -t tmpfs -o size=${megabytes}m tmpfs "$1" && exec "$2" "$3" "$1" 50000 "$4" "$5"`;
  const args = ['-rm', 'sh', '-c', command, 'sh', disk, process.execPath, child, manner, String(ballast)];
  const output = execFileSync('unshare', args, { encoding: 'utf8' });
  return output
    .trim()
    .split('\n')
    .map((line) => JSON.parse(line) as Outcome);
}

// Ballast so that the room ends in the scratch files, before the result files, in pathlines.nc or frames.nc.
describe.each([
  ['asked', [18_000_000, 9_000_000, 7_500_000]],
  ['silent', [18_000_000, 15_000_000, 7_500_000]],
] as const)('a disk that fills and is %s about its free space', (manner, ballasts) => {
  it.skipIf(!needs('mount namespaces')).each([...ballasts])(
    'with %i bytes of ballast leaves no result, says where and how much, and serves a rerun',
    (ballast) => {
      const [full, again] = twoRuns(manner, ballast);
      expect(full.code).toBe('store/disk-full');
      expect(full.complete).toBe(false);
      expect(full.files).toEqual([]);
      expect(full.details?.path).toContain(join(disk, 'result'));
      expect(full.details?.needBytes).toBeGreaterThan(0);
      expect(full.message).toContain(join(disk, 'result'));
      expect(full.message).toMatch(/^disk full: got .*, expected .*; make room/);
      expect(again).toMatchObject({ code: null, complete: true });
    },
  );

  it.skipIf(!needs('mount namespaces'))('keeps an earlier result and says that it takes room', () => {
    const [first, over] = twoRuns(manner, 0);
    expect(first).toMatchObject({ code: null, complete: true });
    expect(over).toMatchObject({ code: 'store/disk-full', complete: true, files: first.files });
    expect(over.message).toMatch(/make room .*; the earlier result in the folder takes \d\.\d MB and stays/);
  });

  it.skipIf(!needs('mount namespaces'))('does not complain while there is room', () => {
    for (const outcome of twoRuns(manner, 0, 40)) expect(outcome).toMatchObject({ code: null, complete: true });
  });
});
