import type { DetectionBlock, LinkedBlock } from '../core/columns.js';
import type { RunContext } from '../core/context.js';
import { createLinker } from '../linking/create-linker.js';
import { LinkComparison } from '../linking/given-check.js';
import { GivenPathlines } from '../linking/given-pathlines.js';
import type { Linker } from '../linking/linker.js';
import { StuckLinks, withoutPlaces } from '../linking/stuck-links.js';
import type { LinkCounts, Stage } from './board.js';
import { linkBlock } from './link-block.js';

/** Turns the stream of detections into a stream of linked ones: our own links, or those the dump came with. */
export const linkStage: Stage = {
  name: 'link',
  needs: ['scan', 'look', 'detections'],
  gives: ['linked', 'linkCounts', 'stuckPathlines'],
  timed: false,
  run(board) {
    const { context, request } = board;
    const { settings } = request.resolved;
    const mode = board.scan!.has.pathline ? settings.dump.given : 'ignore';
    const counts: LinkCounts = { links: 0, bridging: 0, leftOutForRisk: 0, pathlines: 0, given: null };
    const linker = mode === 'keep' ? null : createLinker(settings.linking, board.look!.link);
    const given = mode === 'ignore' ? null : new GivenPathlines(settings.linking.bridge);
    board.linkCounts = counts;
    const { stuck, link } = board.look!;
    const apart =
      linker === null || stuck.length === 0 ? null : new StuckLinks(stuck, link.dims, settings.linking.bridge);
    board.stuckPathlines = apart === null ? new Set() : apart.pathlines;
    const total = board.scan!.frameNumbers.length;
    board.linked = linkStream(board.detections!, linker, apart, given, settings.linking.bridge, counts, total, context);
  },
};

async function* linkStream(
  blocks: AsyncIterable<DetectionBlock>,
  linker: Linker | null,
  apart: StuckLinks | null,
  given: GivenPathlines | null,
  bridge: number,
  counts: LinkCounts,
  total: number,
  context: RunContext,
): AsyncGenerator<LinkedBlock> {
  const comparison = linker !== null && given !== null ? new LinkComparison(bridge) : null;
  let frames = 0;
  for await (const block of blocks) {
    let own: LinkedBlock | null = null;
    if (linker !== null) {
      own = await (apart === null ? linkBlock(linker, block, context) : linkApart(linker, apart, block, context));
    }
    const theirs = given === null ? null : given.link(block);
    if (comparison !== null) comparison.add(theirs!, own!);
    frames += block.number.length;
    context.progress('link', frames, total, 'frames');
    yield (own ?? theirs)!;
  }
  if (linker !== null) Object.assign(counts, linker.tally);
  if (apart !== null) {
    counts.links += apart.tally.links;
    counts.bridging += apart.tally.bridging;
    counts.pathlines += apart.tally.pathlines;
  }
  if (given === null) return;
  if (linker === null) {
    counts.links = given.tally.links;
    counts.pathlines = given.begun;
  }
  counts.given = { ...given.tally, agreed: comparison?.agreed ?? null };
  const { links, twiceInFrame, broken } = given.tally;
  const agreed = comparison === null ? '' : `, ${comparison.agreed} of them found by linking anew as well`;
  context.event({
    code: 'linking/given-pathlines',
    level: twiceInFrame + broken > 0 ? 'warning' : 'note',
    message: `the dump came with pathline numbers: ${links} links${agreed}; ${twiceInFrame} detections shared a number within a frame, ${broken} links crossed more than ${bridge} missing frames`,
    details: { links, twiceInFrame, broken, agreed: comparison?.agreed ?? null },
  });
}

/** Links a block with what stands at stuck places linked apart. New columns; the others are the block's own. */
async function linkApart(
  linker: Linker,
  apart: StuckLinks,
  block: DetectionBlock,
  context: RunContext,
): Promise<LinkedBlock> {
  const placeOf = apart.take(block);
  const { block: free, rows } = withoutPlaces(block, placeOf);
  const pathline = new Int32Array(block.x.length);
  const linkRisk = new Float32Array(block.x.length);
  const ofFree = new Int32Array(rows.length);
  const risks = new Float32Array(rows.length);
  for (let k = 0; k < block.number.length; k++) {
    apart.frame(block, k, placeOf, linker.begun, pathline);
    linker.frame(free, k, ofFree, risks);
    for (let i = free.offsets[k]; i < free.offsets[k + 1]; i++) {
      pathline[rows[i]] = apart.shifted(ofFree[i]);
      linkRisk[rows[i]] = risks[i];
    }
    await context.breathe();
  }
  return { ...block, pathline, linkRisk };
}
