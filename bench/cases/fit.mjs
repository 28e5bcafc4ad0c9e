/**
 * Local fits, screening and standard errors of frames as they come, span 7. Checked against the closed form of the
 * least-squares slope over an even, full window: sum(k x_k) / (sum(k^2) dt), k = -3..3.
 */
import { fileURLToPath } from 'node:url';
import { EXCLUDED_FROM_GRID } from '@wakeloom/tracker/core/columns';
import { createFrameFit } from '@wakeloom/tracker/kinematics/create-frame-fit';
import { fitWindow } from '@wakeloom/tracker/kinematics/fit-window';
import { RATE } from '../lib/made-block.mjs';
import { madeLinked } from '../lib/made-samples.mjs';
import { check, print, rate, timed } from '../lib/timed.mjs';

const RUNS = 5;

/** Compares the velocity of pathlines seen in all of frames f - 3 .. f + 3; returns how many were compared. */
function compared(linked, samples, frame) {
  const rowIn = (k) => {
    const rows = new Map();
    for (let row = linked.offsets[k]; row < linked.offsets[k + 1]; row++) rows.set(linked.pathline[row], row);
    return rows;
  };
  const around = [-3, -2, -1, 0, 1, 2, 3].map((k) => [k, rowIn(frame + k)]);
  // A window that held a screened sample was fitted again without it.
  const screened = new Set();
  for (let s = samples.offsets[frame - 3]; s < samples.offsets[frame + 4]; s++) {
    if ((samples.flags[s] & EXCLUDED_FROM_GRID) !== 0) screened.add(samples.pathline[s]);
  }
  let count = 0;
  for (let s = samples.offsets[frame]; s < samples.offsets[frame + 1]; s++) {
    if (screened.has(samples.pathline[s])) continue;
    let slope = 0;
    let seen = 0;
    for (const [k, rows] of around) {
      const row = rows.get(samples.pathline[s]);
      if (row === undefined) continue;
      seen++;
      slope += (k * linked.x[row] * RATE) / 28;
    }
    if (seen < 7) continue;
    check(Math.abs(samples.u[s] - slope) <= 1e-5 * (1 + Math.abs(slope)), `u = ${samples.u[s]}, expected ${slope}`);
    count++;
  }
  return count;
}

export async function run() {
  const rows = [];
  for (const dims of [2, 3]) {
    const { linked, parameters } = madeLinked({ frames: 40, perFrame: 10_000, ratio: 0.3, seed: 7, dims });
    const core = { from: 0, to: 40 };
    const samples = fitWindow(linked, core, parameters);
    const inPathlines = linked.pathline.reduce((sum, id) => sum + (id >= 0 ? 1 : 0), 0);
    check(samples.flags.length === inPathlines, `${samples.flags.length} samples of ${inPathlines} detections`);
    check(compared(linked, samples, 20) > 4000, 'too few samples to compare');
    const time = await timed(RUNS, async () => {
      const start = performance.now();
      const fit = createFrameFit(parameters);
      let given = 0;
      for (const steps of [fit.add(linked), fit.finish()]) {
        for (const piece of steps) if (piece !== null) given += piece.flags.length;
      }
      const elapsed = (performance.now() - start) / 1000;
      check(given === inPathlines, `${given} samples of ${inPathlines} detections`);
      return elapsed;
    });
    rows.push({
      name: `fit and screen in ${dims}-D, span 7`,
      ...time,
      rate: rate(inPathlines, time.medianSeconds, 'samples'),
    });
  }
  return rows;
}

if (process.argv[1] === fileURLToPath(import.meta.url)) print(await run());
