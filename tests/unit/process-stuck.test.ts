import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { EXCLUDED_FROM_GRID, FLAG } from '@wakeloom/tracker/core/columns';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { afterAll, describe, expect, it } from 'vitest';
import { type DumpPoint, processPoints } from '../helpers/process-points.js';
import { readResult } from '../helpers/result-columns.js';

const folder = mkdtempSync(join(tmpdir(), 'process-stuck-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));

const NOISE = 0.1;
const [WIDTH, HEIGHT] = [640, 480];
const OPTIONS = { rate: '200 Hz', scale: '0.05 mm/px', bin: '4 mm' };

/** Particles at 4 px a frame, 40 mm/s along x, and specks that never move; detections of the latter come first in each frame. */
function dump(seed: string, frames: number, specks: readonly (readonly [number, number])[], losses: number) {
  const random = randomStream(111, seed);
  const points: DumpPoint[] = [];
  const speck: boolean[] = [];
  const particles = Array.from({ length: 600 }, () => [WIDTH * random.uniform(), HEIGHT * random.uniform()] as const);
  for (let frame = 0; frame < frames; frame++) {
    for (const [x, y] of specks) {
      if (random.uniform() < losses) continue;
      points.push([frame, x + NOISE * random.normal(), y + NOISE * random.normal()]);
      speck.push(true);
    }
    for (const [x, y] of particles) {
      if (random.uniform() < 0.05) continue;
      points.push([frame, ((x + 4 * frame) % WIDTH) + NOISE * random.normal(), y + NOISE * random.normal()]);
      speck.push(false);
    }
  }
  return { points, speck };
}

const scattered = Array.from({ length: 12 }, (_, i) => [40 + ((i * 197) % 560), 30 + ((i * 131) % 420)] as const);
const inRow = Array.from({ length: 40 }, (_, i) => [20 + 15 * i, 240] as const);

describe('specks in a flow', () => {
  it.each([
    ['12 scattered ones', scattered, 60, 0],
    ['12 scattered ones, blinking', scattered, 100, 0.2],
    ['a row of 40', inRow, 60, 0],
    ['a row of 40, blinking', inRow, 100, 0.1],
  ] as const)(
    '%s: found, flagged stuck, and the mean of the flow is left alone',
    async (name, specks, frames, losses) => {
      const { points, speck } = dump(name, frames, specks, losses);
      const out = join(folder, name.replaceAll(/\W/g, '-'));
      const record = await processPoints(points, out, OPTIONS);
      const { samples, column } = await readResult(out);
      let [stuckSpecks, strays, stuckParticles, good, sum] = [0, 0, 0, 0, 0];
      for (let s = 0; s < samples; s++) {
        const flags = column['flags'][s];
        const stuck = (flags & FLAG.stuck) !== 0;
        const isSpeck = speck[column['detection'][s]];
        if (isSpeck && stuck) stuckSpecks++;
        if (isSpeck && (flags & EXCLUDED_FROM_GRID) === 0) strays++;
        if (!isSpeck && stuck) stuckParticles++;
        if ((flags & EXCLUDED_FROM_GRID) !== 0) continue;
        good++;
        sum += column['u'][s];
      }
      const all = speck.filter(Boolean).length;
      // A detection more than 4 noise standard deviations off, or nearest to a particle that passes, is not the speck's;
      // of blinking ones some stand alone between gaps.
      expect(stuckSpecks / all).toBeGreaterThan(losses === 0 ? 0.98 : 0.95);
      expect(strays / all).toBeLessThan(0.002);
      expect(stuckParticles).toBeLessThan(0.002 * samples);
      expect(Math.abs(sum / good / 40 - 1)).toBeLessThan(0.002);
      expect(record.counts.flagged['stuck']).toBeGreaterThanOrEqual(stuckSpecks);
      expect(record.warnings.some((warning) => warning.includes('stuck'))).toBe(true);
      // Screening takes hardly any particle with the specks.
      expect(good).toBeGreaterThan(0.93 * (points.length - all));
      // Pathlines are numbered by their first frame, specks or not.
      const firsts = firstFrames(column['frame'], samples, (await readResult(out)).pathline);
      for (let p = 1; p < firsts.length; p++) expect(firsts[p]).toBeGreaterThanOrEqual(firsts[p - 1]);
    },
    60_000,
  );

  it('slow particles of a recirculation are no specks', async () => {
    const random = randomStream(112, 'slow');
    const points: DumpPoint[] = [];
    // A vortex at rest in the middle: speed 0.02 px a frame at 10 px from its centre, 0.6 px at the rim.
    const particles = Array.from(
      { length: 700 },
      () => [300 * Math.sqrt(random.uniform()), 6.3 * random.uniform()] as const,
    );
    for (let frame = 0; frame < 150; frame++) {
      for (const [radius, phase] of particles) {
        const angle = phase + 0.002 * frame;
        points.push([
          frame,
          320 + radius * Math.cos(angle) + NOISE * random.normal(),
          320 + radius * Math.sin(angle) + NOISE * random.normal(),
        ]);
      }
    }
    const out = join(folder, 'slow');
    const record = await processPoints(points, out, OPTIONS);
    const { samples, column } = await readResult(out);
    expect(samples).toBeGreaterThan(0.9 * points.length);
    // None that moves by more than its noise is taken for a speck: 4 noise standard deviations in 150 frames at 1.3 px.
    for (let s = 0; s < samples; s++) {
      if ((column['flags'][s] & FLAG.stuck) === 0) continue;
      const x = column['x'][s] / 0.05 - 320;
      const y = column['y'][s] / 0.05 - 320;
      expect(Math.hypot(x, y)).toBeLessThan(2);
    }
    expect(record.warnings.filter((warning) => warning.includes('stuck'))).toEqual([]);
  }, 60_000);
});

function firstFrames(frame: Float64Array, samples: number, pathline: Int32Array): number[] {
  const firsts: number[] = [];
  for (let s = 0; s < samples; s++) if (s === 0 || pathline[s] !== pathline[s - 1]) firsts.push(frame[s]);
  return firsts;
}
