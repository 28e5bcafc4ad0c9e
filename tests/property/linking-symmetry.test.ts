import type { DetectionBlock } from '@wakeloom/tracker';
import { taylorGreen } from '@wakeloom/tracker/synthesis/flows-cellular';
import { describe, expect, it } from 'vitest';
import { linkBlock, linkSet } from '../helpers/link-block';
import { truthBlock, truthDump } from '../helpers/truth';

// A cellular flow at a displacement ratio of about 0.5, with losses, false detections and noise: enough conflicts
// that a dependence on order or orientation would show.
const dump = truthDump({
  flow: taylorGreen(30, (2 * Math.PI) / 30),
  frames: 24,
  rate: 25,
  perFrame: 1200,
  box: [
    [0, 48],
    [0, 36],
  ],
  lossShare: 0.05,
  ghostShare: 0.05,
  noise: 0.005,
  steps: 4,
  seed: 17,
});
const block = truthBlock(dump);
const plain = linkBlock(block).then(({ pathline }) => linkSet(pathline, dump.frame));

function moved(change: (x: number, y: number) => [number, number]): DetectionBlock {
  const places = Array.from(block.x, (x, row) => change(x, block.y[row]));
  return { ...block, x: Float64Array.from(places, (p) => p[0]), y: Float64Array.from(places, (p) => p[1]) };
}

async function linksOf(changed: DetectionBlock): Promise<Set<string>> {
  return linkSet((await linkBlock(changed)).pathline, dump.frame);
}

function common(a: Set<string>, b: Set<string>): number {
  let both = 0;
  for (const link of a) if (b.has(link)) both++;
  return both;
}

describe('the same links', () => {
  it('whatever the order of rows within frames', async () => {
    const reversed = { ...block, x: block.x.slice(), y: block.y.slice(), row: block.row.slice() };
    for (let k = 0; k < block.number.length; k++) {
      for (const column of [reversed.x, reversed.y, reversed.row]) {
        column.subarray(block.offsets[k], block.offsets[k + 1]).reverse();
      }
    }
    const links = await linksOf(reversed);
    expect(links.size).toBeGreaterThan(15_000);
    expect(links).toEqual(await plain);
  });

  it.each([
    ['mirrored left to right', (x: number, y: number): [number, number] => [-x, y]],
    ['mirrored top to bottom', (x: number, y: number): [number, number] => [x, -y]],
    ['turned by a quarter', (x: number, y: number): [number, number] => [-y, x]],
    ['1024 times as large', (x: number, y: number): [number, number] => [1024 * x, 1024 * y]],
    ['1/4096 as large', (x: number, y: number): [number, number] => [x / 4096, y / 4096]],
  ])('when the field is %s', async (_name, change) => {
    expect(await linksOf(moved(change))).toEqual(await plain);
  });

  it.each([
    ['shifted', (x: number, y: number): [number, number] => [x + 123.4567, y - 9.87]],
    ['scaled by 3', (x: number, y: number): [number, number] => [3 * x, 3 * y]],
  ])('but for 1 in 10 000 when the field is %s', async (_name, change) => {
    const [a, b] = [await plain, await linksOf(moved(change))];
    expect(common(a, b)).toBeGreaterThanOrEqual(0.9999 * Math.max(a.size, b.size));
  });

  it('from both neighbour searches', async () => {
    const { pathline } = await linkBlock(block, {}, { search: 'kd-tree' });
    expect(linkSet(pathline, dump.frame)).toEqual(await plain);
  });
});
