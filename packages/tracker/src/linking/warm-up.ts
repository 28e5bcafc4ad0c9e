import type { DetectionBlock } from '../core/columns.js';
import type { Linker, LinkKnowledge } from './linker.js';

/** Frames that are linked there and back: enough for lost regions to be found again, few enough for flows that change. */
const FRAMES = 6;

/**
 * What a linker can know of the flow before it links the first frame for good: it links the first frames forward, then
 * backward from the last of them to the first. What it learnt on the way back belongs to the first interval, so that
 * pathlines begin as surely as they go on later. `linker` is used up. Null where the first segment is too short.
 */
export async function warmUp(
  linker: Linker,
  blocks: readonly DetectionBlock[],
  breathe: () => Promise<void>,
): Promise<LinkKnowledge | null> {
  const frames = firstFrames(blocks);
  if (frames.length < 3) return null;
  const most = Math.max(...blocks.map((block) => block.x.length));
  const pathline = new Int32Array(most);
  const risk = new Float32Array(most);
  for (const { block, k } of frames) {
    linker.frame(block, k, pathline, risk);
    await breathe();
  }
  linker.turnRound();
  for (const { block, k } of frames.reverse()) {
    linker.frame(turned(block), k, pathline, risk);
    await breathe();
  }
  linker.turnRound();
  return linker.knowledge();
}

/** The first frames of the first segment. */
function firstFrames(blocks: readonly DetectionBlock[]): { block: DetectionBlock; k: number }[] {
  const frames: { block: DetectionBlock; k: number }[] = [];
  let segment: number | null = null;
  for (const block of blocks) {
    for (let k = 0; k < block.number.length; k++) {
      segment ??= block.segment[k];
      if (frames.length === FRAMES || block.segment[k] !== segment) return frames;
      frames.push({ block, k });
    }
  }
  return frames;
}

/** The block with time running backward. Columns of detections are the block's own. */
function turned(block: DetectionBlock): DetectionBlock {
  return { ...block, number: block.number.map((number) => -number), time: block.time.map((time) => -time) };
}
