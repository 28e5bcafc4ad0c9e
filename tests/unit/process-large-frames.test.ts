import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { afterAll, expect, it } from 'vitest';
import { type DumpPoint, processPoints } from '../helpers/process-points.js';
import { readResult } from '../helpers/result-columns.js';

const folder = mkdtempSync(join(tmpdir(), 'process-large-frames-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));

const PARTICLES = 42_000;
const FRAMES = 6;

it('frames that fill a block each are linked like small ones', async () => {
  const random = randomStream(113, 'large frames');
  // 20 px apart on the mean, 6 px a frame along x: ratio 0.3. Those that leave on the right are not replaced.
  const edge = 20 * Math.sqrt(PARTICLES);
  const particles = Array.from(
    { length: PARTICLES },
    () => [edge * random.uniform(), edge * random.uniform()] as const,
  );
  const points: DumpPoint[] = [];
  const owner: number[] = [];
  for (let frame = 0; frame < FRAMES; frame++) {
    for (const [i, [x, y]] of particles.entries()) {
      if (x + 6 * frame > edge) continue;
      points.push([frame, x + 6 * frame + 0.1 * random.normal(), y + 0.1 * random.normal()]);
      owner.push(i);
    }
  }
  const out = join(folder, 'result');
  const record = await processPoints(points, out, { rate: '100 Hz', scale: '0.05 mm/px' });
  const seen = new Int32Array(PARTICLES);
  for (const i of owner) seen[i]++;
  // Pathlines of fewer than five samples (default) are not in the files.
  const links = seen.reduce((sum, count) => sum + (count >= 5 ? count - 1 : 0), 0);
  expect(record.counts.links / links).toBeGreaterThan(0.98);
  expect(record.counts.links / links).toBeLessThan(1.002);
  const { samples, column, pathline } = await readResult(out);
  let wrong = 0;
  for (let s = 1; s < samples; s++) {
    if (pathline[s] !== pathline[s - 1]) continue;
    if (owner[column['detection'][s]] !== owner[column['detection'][s - 1]]) wrong++;
  }
  expect(wrong / record.counts.links).toBeLessThan(0.002);
}, 120_000);
