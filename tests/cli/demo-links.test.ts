import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import type { DemoName } from '@wakeloom/tracker/synthesis/demo';
import { afterAll, describe, expect, it } from 'vitest';
import { demoTruth } from '../helpers/demo-truth.js';
import { readTable } from '../helpers/read-table.js';
import { runCli } from '../helpers/run-cli.js';
import { scoreLinks } from '../helpers/score-links.js';

const folder = mkdtempSync(join(tmpdir(), 'demo-links-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));

/** Missing frames a pathline may cross by default. */
const BRIDGE = 2;
/** Median of |e| / s for a normal error e of standard deviation s: the 75 % quantile of the standard normal. */
const MEDIAN_OF_NORMAL = 0.6744898;
/** Position noise of both demos in the plane and along z, mm (0.1 and 0.3 px of 0.05 mm). */
const NOISE = [0.005, 0.005, 0.015];

/** The demo made, processed and exported as a user types it, and what the generator knows of its rows. */
async function demoSamples(name: DemoName) {
  const cli = async (...words: string[]) => {
    const { code, stderr } = await runCli([...words, '--quiet'], { cwd: folder });
    expect([code, stderr]).toEqual([0, '']);
  };
  const table = `${name}.csv`;
  const commands = async () => {
    await cli('demo', name, '--out', name);
    await cli('process', join(name, `${name}.yaml`), '--out', join(name, 'result'));
    await cli('export', join(name, 'result'), 'pathlines', '--format', 'csv', '--out', table);
  };
  const [truth] = await Promise.all([demoTruth(name), commands()]);
  const axes = truth.dims === 3 ? ['u', 'v', 'w'] : ['u', 'v'];
  const wanted = ['pathline', 'frame', 'detection', ...axes, ...axes.map((axis) => `${axis}_se`)];
  return { truth, axes, samples: await readTable(join(folder, table), wanted) };
}

function median(values: Float64Array): number {
  const sorted = values.slice().sort();
  return sorted[sorted.length >> 1];
}

describe.each<[DemoName, number, number]>([
  ['cylinder-wake', 60, 1_100_000],
  ['swirl', 45, 500_000],
])('the demo %s through the commands', (name, rate, fewest) => {
  it('has at least 0.995 of its links right and 0.985 of the true links, and the velocities it claims', async () => {
    const { truth, axes, samples } = await demoSamples(name);
    const { column } = samples;
    expect(samples.rows).toBeGreaterThan(fewest);

    const pathline = new Int32Array(truth.rows).fill(-1);
    for (let s = 0; s < samples.rows; s++) {
      const row = column.detection[s];
      // Each detection is in one pathline at most, and in the frame that the dump gives it.
      expect(pathline[row]).toBe(-1);
      if (pathline[row] !== -1) throw new Error(`detection ${row} is in two pathlines`);
      if (truth.frame[row] !== column.frame[s]) throw new Error(`sample ${s}: detection ${row} in another frame`);
      pathline[row] = column.pathline[s];
    }
    const score = scoreLinks(pathline, truth.particle, truth.frame, BRIDGE);
    console.log(`${name}: precision ${score.precision.toFixed(5)}, recall ${score.recall.toFixed(5)}`);
    expect(score.precision).toBeGreaterThanOrEqual(0.995);
    expect(score.recall).toBeGreaterThanOrEqual(0.985);

    for (const [axis, letter] of axes.entries()) {
      const error = new Float64Array(samples.rows);
      const scaled = new Float64Array(samples.rows);
      let known = 0;
      for (let s = 0; s < samples.rows; s++) {
        const real = truth.velocity[3 * column.detection[s] + axis];
        if (Number.isNaN(real)) continue;
        error[known] = Math.abs(column[letter][s] - real);
        scaled[known] = error[known] / column[`${letter}_se`][s];
        known++;
      }
      expect(known).toBeGreaterThan(0.99 * samples.rows);
      const middle = median(error.subarray(0, known));
      const claimed = median(scaled.subarray(0, known)) / MEDIAN_OF_NORMAL;
      console.log(
        `${name}: ${letter} median error ${middle.toFixed(4)} mm/s, ${claimed.toFixed(3)} of what its standard error says`,
      );
      // Better than the plain difference of the detections before and after: noise * rate / sqrt(2).
      expect(middle).toBeLessThan((MEDIAN_OF_NORMAL * NOISE[axis] * rate) / Math.SQRT2);
      // A standard error states the random part; curvature within the window adds some, a tenth or so of it.
      expect(claimed).toBeGreaterThan(0.9);
      expect(claimed).toBeLessThan(1.15);
    }
  }, 300_000);
});
