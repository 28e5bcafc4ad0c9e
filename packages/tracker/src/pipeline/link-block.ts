import type { DetectionBlock, LinkedBlock } from '../core/columns.js';
import type { RunContext } from '../core/context.js';
import type { Linker } from '../linking/linker.js';

/** Links one block with a linker that has linked all before it. New columns; the others are the block's own. */
export async function linkBlock(linker: Linker, block: DetectionBlock, context: RunContext): Promise<LinkedBlock> {
  const pathline = new Int32Array(block.x.length);
  const linkRisk = new Float32Array(block.x.length);
  for (let k = 0; k < block.number.length; k++) {
    linker.frame(block, k, pathline, linkRisk);
    await context.breathe();
  }
  return { ...block, pathline, linkRisk };
}
