import { createContext, type DetectionBlock } from '@wakeloom/tracker';
import { createFrameSorter } from '@wakeloom/tracker/detections/canonical-order';
import { createLinker, type LinkPrior } from '@wakeloom/tracker/linking/create-linker';
import { firstLook } from '@wakeloom/tracker/pipeline/first-look';
import { resolveRun } from '@wakeloom/tracker/run/resolve';
import type { LinkingSettings } from '@wakeloom/tracker/run/settings';
import { abcFlow, taylorGreen } from '@wakeloom/tracker/synthesis/flows-cellular';
import { describe, expect, it } from 'vitest';
import { type TruthDump, truthBlock, truthDump } from '../helpers/truth';

const settings = resolveRun({ options: { rate: '25 Hz', scale: '1 mm/px' }, dumpFiles: ['a.csv'] }).settings;

/** Conflicts, gaps and false detections enough that any state lost or doubled at a cut would show. */
const plane = truthDump({
  flow: taylorGreen(30, (2 * Math.PI) / 30),
  frames: 11,
  rate: 25,
  perFrame: 420,
  box: [
    [0, 30],
    [0, 20],
  ],
  lossShare: 0.08,
  ghostShare: 0.08,
  noise: 0.005,
  steps: 4,
  seed: 31,
});
const volume = truthDump({
  flow: abcFlow(),
  frames: 8,
  rate: 4,
  perFrame: 350,
  box: [
    [0, 3],
    [0, 3],
    [0, 3],
  ],
  lossShare: 0.05,
  ghostShare: 0.05,
  noise: 0.002,
  steps: 4,
  seed: 32,
});

/** The frames in blocks of the given sizes in turn, as the calibration hands them on; frame numbers and segments by frame. */
function cut(dump: TruthDump, sizes: readonly number[], numberOf = (k: number) => k, segmentOf = (_k: number) => 0) {
  const sort = createFrameSorter();
  const blocks: DetectionBlock[] = [];
  for (let from = 0, n = 0; from < dump.number.length; n++) {
    const to = Math.min(dump.number.length, from + sizes[n % sizes.length]);
    const start = from;
    const plain = truthBlock(dump, from, to);
    const block = {
      ...plain,
      number: plain.number.map((_, k) => numberOf(start + k)),
      segment: plain.segment.map((_, k) => segmentOf(start + k)),
    };
    for (let k = 0; k < to - from; k++) sort(block, block.offsets[k], block.offsets[k + 1]);
    blocks.push(block);
    from = to;
  }
  return blocks;
}

/** Pathline and risk of every row, and the counts, from a linker that is handed these blocks. */
function linked(blocks: readonly DetectionBlock[], linking: LinkingSettings, prior: LinkPrior) {
  const linker = createLinker(linking, prior);
  const pathline: number[] = [];
  const risk: number[] = [];
  for (const block of blocks) {
    const into = new Int32Array(block.x.length).fill(-9);
    const risks = new Float32Array(block.x.length).fill(-9);
    for (let k = 0; k < block.number.length; k++) linker.frame(block, k, into, risks);
    pathline.push(...into);
    risk.push(...risks);
  }
  return { pathline, risk, tally: linker.tally };
}

/** More than there are. */
const ALL = 1000;
const bursts = (k: number) => Math.floor(k / 5);
/** Two frames without any detection stand in no block. */
const gaps = (k: number) => (k < 6 ? k : k + 2);

describe('links are the same bits however the frames are cut into blocks', () => {
  it.each([
    ['in the plane', () => [ALL, [1], [3, 1, 2]], (sizes: number[]) => cut(plane, sizes), 'thorough'],
    ['with little care', () => [ALL, [1], [5, 2]], (sizes: number[]) => cut(plane, sizes), 'quick'],
    ['in space', () => [ALL, [1], [3, 2]], (sizes: number[]) => cut(volume, sizes), 'thorough'],
    [
      'in bursts, within and between',
      () => [ALL, [1], [5], [4, 3]],
      (sizes: number[]) => cut(plane, sizes, undefined, bursts),
      'thorough',
    ],
    [
      'with frames that hold nothing',
      () => [ALL, [6], [7], [2, 1]],
      (sizes: number[]) => cut(plane, sizes, gaps),
      'thorough',
    ],
  ] as const)('%s', async (_name, cuts, blocksOf, care) => {
    const [whole, ...others] = cuts().map((sizes) => blocksOf(typeof sizes === 'number' ? [sizes] : sizes));
    expect(whole.length).toBe(1);
    const linking = { ...settings.linking, care };
    // The first look has a block of its own in a run.
    const { link } = await firstLook(whole, { ...settings, linking }, 1, createContext());
    const want = linked(whole, linking, link);
    // There is something that could differ.
    expect(want.tally.links).toBeGreaterThan(1500);
    expect(want.risk.filter((risk) => risk > 0.001).length).toBeGreaterThan(20);
    for (const blocks of others) {
      expect(blocks.length).toBeGreaterThan(1);
      expect(linked(blocks, linking, link)).toEqual(want);
    }
  });
});
