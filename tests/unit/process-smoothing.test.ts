import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { afterAll, describe, expect, it } from 'vitest';
import { type DumpPoint, processPoints } from '../helpers/process-points.js';

const folder = mkdtempSync(join(tmpdir(), 'process-smoothing-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));

describe('smoothing in run.json', () => {
  it('forecasts what the span takes from solid rotation, as its closed form says', async () => {
    const [turn, rim, m] = [0.1, 100, 3];
    const random = randomStream(131, 'rotation');
    const particles = Array.from({ length: 120 }, () => [rim * Math.sqrt(random.uniform()), 6.3 * random.uniform()]);
    const points: DumpPoint[] = [];
    for (let frame = 0; frame < 60; frame++) {
      for (const [radius, phase] of particles) {
        const angle = phase + turn * frame;
        const noise = () => 0.02 * random.normal();
        points.push([frame, 150 + radius * Math.cos(angle) + noise(), 150 + radius * Math.sin(angle) + noise()]);
      }
    }
    const options = { rate: '100 Hz', scale: '0.05 mm/px', span: `${2 * m + 1}` };
    const record = await processPoints(points, folder, options);
    const line = record.systematic.find(({ source }) => source === 'smoothing.span')!;
    expect(line.unit).toBe('mm/s');
    expect(line.effect).toContain('not in the _se columns');
    // Attenuation sum(k sin(k theta)) / (theta sum(k^2)); mean square of one component over the particles: omega^2 r^2 / 2.
    let [upper, lower] = [0, 0];
    for (let k = -m; k <= m; k++) {
      upper += k * Math.sin(k * turn);
      lower += turn * k * k;
    }
    const speeds = particles.map(([radius]) => radius * 0.05 * turn * 100);
    const component = Math.sqrt(speeds.reduce((sum, speed) => sum + speed * speed, 0) / speeds.length / 2);
    const truth = (1 - upper / lower) * component;
    expect(Math.abs(line.standardUncertainty / truth - 1)).toBeLessThan(0.1);
  }, 30_000);
});
