/**
 * Neighbours within one mean spacing of every particle (3 on average in the plane, 4 in space): building the index and
 * asking for all. Both searches must find the same rows before they are timed.
 */
import { fileURLToPath } from 'node:url';
import { CellIndex } from '@wakeloom/tracker/math/cell-index';
import { KdSearch } from '@wakeloom/tracker/math/kd-search';
import { madeBlock } from '../lib/made-block.mjs';
import { check, print, timed } from '../lib/timed.mjs';

const RUNS = 3;

function all(search, block, count, reach) {
  const near = new Int32Array(count);
  const answer = { found: 0, rows: 0 };
  const start = performance.now();
  search.build(block, 0, count, block.dims, [reach, reach, reach]);
  for (let row = 0; row < count; row++) {
    const found = search.near(block.x[row], block.y[row], block.dims === 3 ? block.z[row] : 0, near);
    answer.found += found;
    for (let n = 0; n < found; n++) answer.rows += near[n] * ((row % 7) + 1);
  }
  return { seconds: (performance.now() - start) / 1000, answer };
}

export async function run() {
  const rows = [];
  for (const dims of [2, 3]) {
    const count = 50_000;
    const { block } = madeBlock({ frames: 1, perFrame: count, ratio: 0.3, seed: 3, dims });
    const searches = { 'typed-array cells': () => new CellIndex(), 'kd-tree-javascript': () => new KdSearch() };
    const answers = Object.values(searches).map((make) => JSON.stringify(all(make(), block, count, 1).answer));
    check(answers[0] === answers[1], `${dims}-D neighbours differ: ${answers.join(' and ')}`);
    for (const [name, make] of Object.entries(searches)) {
      const search = make();
      const time = await timed(RUNS, async () => all(search, block, count, 1).seconds);
      const each = `${Math.round((time.medianSeconds / count) * 1e9)} ns a particle`;
      rows.push({ name: `neighbours in ${dims}-D, ${name}, 50 000 particles`, ...time, rate: each });
    }
  }
  return rows;
}

if (process.argv[1] === fileURLToPath(import.meta.url)) print(await run());
