import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, expect, it } from 'vitest';
import { uniformPoints } from '../helpers/points';
import { runCli } from '../helpers/run-cli';

const folder = mkdtempSync(join(tmpdir(), 'wakeloom-step-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));

it('a dump of every third frame has no missing frames, keeps its numbers and gives true velocities', async () => {
  const places = uniformPoints(300, 2, 31, 500);
  const lines = ['frame,x,y'];
  for (let k = 0; k < 20; k++) {
    for (let p = 0; p < 300; p++) lines.push(`${7 + 3 * k},${places.x[p] + 4 * k},${places.y[p] - 2 * k}`);
  }
  const dump = join(folder, 'third.csv');
  writeFileSync(dump, `${lines.join('\n')}\n`);
  const out = join(folder, 'out');
  // 300 Hz numbering: 4 px in 3 / 300 s are 400 px/s.
  const done = await runCli(['process', dump, '--rate', '300 Hz', '--out', out]);
  expect(done.stderr).toContain('steps of 3');
  const { counts } = JSON.parse(readFileSync(join(out, 'run.json'), 'utf8'));
  expect(counts.linksBridging).toBe(0);
  expect(counts.pathlines).toBe(300);
  const csv = join(folder, 'out.csv');
  await runCli(['export', out, 'pathlines', '--format', 'csv', '--out', csv]);
  const [head, ...rows] = readFileSync(csv, 'utf8').trim().split('\n');
  const at = Object.fromEntries(head.split(',').map((name, i) => [name, i]));
  expect(rows.length).toBe(6000);
  for (const row of rows) {
    const cells = row.split(',').map(Number);
    expect((cells[at['frame']] - 7) % 3).toBe(0);
    expect(cells[at['t']]).toBeCloseTo((cells[at['frame']] - 7) / 300, 9);
    expect(Math.abs(cells[at['u']] - 400)).toBeLessThan(1e-3);
    expect(Math.abs(cells[at['v']] + 200)).toBeLessThan(1e-3);
  }
});
