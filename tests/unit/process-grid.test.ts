import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { openNodeResultPlace } from '@wakeloom/tracker/node';
import { openResult } from '@wakeloom/tracker/store/read-result';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { afterAll, describe, expect, it } from 'vitest';
import { type DumpPoint, processPoints } from '../helpers/process-points.js';

const folder = mkdtempSync(join(tmpdir(), 'process-grid-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));

describe('the grid of a run', () => {
  it('holds as many samples as run.json says, and a full field fills all of its bins', async () => {
    const random = randomStream(81, 'full field');
    // Particles cross a field of 400 px x 240 px at 3 px a frame; noise 0.1 px carries some over its borders.
    const points: DumpPoint[] = [];
    const width = 400;
    const particles = Array.from({ length: 500 }, () => [width * random.uniform(), 240 * random.uniform()] as const);
    for (let frame = 0; frame < 60; frame++) {
      for (const [x, y] of particles) {
        if (random.uniform() < 0.1) continue;
        points.push([frame, ((x + 3 * frame) % width) + 0.1 * random.normal(), y + 0.1 * random.normal()]);
      }
    }
    const record = await processPoints(points, folder, { rate: '50 Hz', scale: '0.05 mm/px', bin: '2 mm' });
    const result = await openResult(await openNodeResultPlace(folder, { create: false }));
    const grid = result.grid();
    result.close();
    expect(record.counts.samplesInGrid).toBeGreaterThan(20_000);
    expect(grid!.samples.reduce((sum, n) => sum + n, 0)).toBe(record.counts.samplesInGrid);
    // 20 mm x 12 mm in bins of 2 mm.
    expect([record.counts.bins, record.counts.binsFilled]).toEqual([60, 60]);
  }, 60_000);
});
