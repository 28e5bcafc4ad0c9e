import { taylorGreen } from '@wakeloom/tracker/synthesis/flows-cellular';
import { describe, expect, it } from 'vitest';
import { linkBlock } from '../helpers/link-block';
import { truthBlock, truthDump } from '../helpers/truth';

/** At a ratio of 1 detections have several candidates, whose order in a sum of risks must not come from the search. */
describe('links by typed-array cells and by kd-tree-javascript', () => {
  it.each(['quick', 'thorough'] as const)('have the same numbers and the same risks, bit for bit: %s', async (care) => {
    const side = 24;
    const dump = truthDump({
      flow: taylorGreen(30, (2 * Math.PI) / 20),
      frames: 12,
      rate: 20,
      perFrame: 500,
      box: [
        [0, side],
        [0, side],
      ],
      lossShare: 0.1,
      ghostShare: 0.2,
      noise: 0.06,
      seed: 8,
    });
    const block = truthBlock(dump);
    const cells = await linkBlock(block, { rate: '20 Hz' }, { care, search: 'cells' });
    const tree = await linkBlock(block, { rate: '20 Hz' }, { care, search: 'kd-tree' });
    expect(cells.tally.links).toBeGreaterThan(2000);
    expect(tree.pathline).toEqual(cells.pathline);
    expect(tree.risk).toEqual(cells.risk);
  });
});
