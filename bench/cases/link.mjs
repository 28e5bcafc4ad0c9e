/**
 * Linking at 10 000 detections a frame and a displacement ratio of 0.3: both neighbour searches, both degrees of care.
 * The two searches must give the same links before either is timed. The k-d tree works on fewer frames; rates compare.
 */
import { fileURLToPath } from 'node:url';
import { createContext } from '@wakeloom/tracker';
import { createLinker } from '@wakeloom/tracker/linking/create-linker';
import { firstLook } from '@wakeloom/tracker/pipeline/first-look';
import { madeBlock, madeSettings } from '../lib/made-block.mjs';
import { check, print, rate, timed } from '../lib/timed.mjs';

const PER_FRAME = 10_000;
const FRAMES = 60;
const TREE_FRAMES = 6;
const RUNS = 5;

function link(block, settings, look, frames) {
  const pathline = new Int32Array(frames * PER_FRAME);
  const risk = new Float32Array(frames * PER_FRAME);
  const linker = createLinker(settings, look.link);
  const start = performance.now();
  for (let k = 0; k < frames; k++) linker.frame(block, k, pathline, risk);
  return { seconds: (performance.now() - start) / 1000, pathline };
}

/** Share of the links between successive frames that join two detections of one particle. */
function shareRight(pathline, particle) {
  const last = new Map();
  let right = 0;
  let made = 0;
  for (let row = 0; row < pathline.length; row++) {
    const before = last.get(pathline[row]);
    if (before !== undefined) {
      made++;
      if (particle[before] >= 0 && particle[before] === particle[row]) right++;
    }
    last.set(pathline[row], row);
  }
  return right / made;
}

export async function run() {
  const { block, particle } = madeBlock({ frames: FRAMES, perFrame: PER_FRAME, ratio: 0.3, seed: 5 });
  const settings = madeSettings();
  const look = await firstLook([block], settings, 1, createContext());
  const rows = [];
  for (const care of ['quick', 'thorough']) {
    const cells = { ...settings.linking, care, search: 'cells' };
    const tree = { ...cells, search: 'kd-tree' };
    const found = link(block, cells, look, FRAMES).pathline;
    check(shareRight(found, particle) > 0.99, `${care}: ${shareRight(found, particle)} of the links join one particle`);
    const same = link(block, tree, look, TREE_FRAMES).pathline.every((id, row) => id === found[row]);
    check(same, `${care}: the two searches give other links`);
    for (const [name, linking, frames] of [
      ['typed-array cells', cells, FRAMES],
      ['kd-tree-javascript', tree, TREE_FRAMES],
    ]) {
      const time = await timed(RUNS, async () => link(block, linking, look, frames).seconds);
      const detections = frames * PER_FRAME;
      rows.push({ name: `link, ${care}, ${name}`, ...time, rate: rate(detections, time.medianSeconds, 'detections') });
    }
  }
  return rows;
}

if (process.argv[1] === fileURLToPath(import.meta.url)) print(await run());
