import type { SampleBlock } from '../core/columns.js';
import { EXCLUDED_FROM_GRID, FLAG } from '../core/columns.js';
import { addFrameVelocity } from '../detections/frame-velocity.js';
import { fitStage } from '../kinematics/fit-stage.js';
import type { Extremes, SampleExtent, Stage } from './board.js';
import { restoreNumbers } from './frame-step.js';

/** Turns linked detections into samples: fit, screening, velocity of a towed frame; notes their extent. */
export const samplesStage: Stage = {
  name: 'fit',
  needs: ['scan', 'look', 'linked', 'stuckPathlines'],
  gives: ['samples', 'extent'],
  timed: false,
  run(board) {
    const { settings } = board.request.resolved;
    const input = { settings, scan: board.scan!, prior: board.look!.prior, context: board.context };
    const extent: SampleExtent = { trusted: nowhere(), all: nowhere(), samples: 0 };
    board.extent = extent;
    const fitted = fitStage(input, board.linked!, board.tools.fit);
    const { frameNumbers } = board.scan!;
    const restore = (block: SampleBlock) => restoreNumbers(block.number, frameNumbers[0], board.look!.prior.frameStep);
    board.samples = finishSamples(fitted, settings.geometry.frame.velocity, restore, extent, board.stuckPathlines!);
  },
};

async function* finishSamples(
  blocks: AsyncIterable<SampleBlock>,
  frameVelocity: readonly [number, number, number] | null,
  restore: (block: SampleBlock) => void,
  extent: SampleExtent,
  stuck: ReadonlySet<number>,
): AsyncGenerator<SampleBlock> {
  for await (const block of blocks) {
    restore(block);
    if (stuck.size > 0) flagStuck(block, stuck);
    if (frameVelocity !== null) addFrameVelocity(block, frameVelocity);
    extent.samples += block.flags.length;
    noteExtremes(block, extent);
    yield block;
  }
}

function flagStuck({ pathline, flags }: SampleBlock, stuck: ReadonlySet<number>): void {
  for (let row = 0; row < flags.length; row++) if (stuck.has(pathline[row])) flags[row] |= FLAG.stuck;
}

function nowhere(): Extremes {
  const { POSITIVE_INFINITY: far } = Number;
  return { min: [far, far, far], max: [-far, -far, -far] };
}

/** What the grid leaves out must not stretch it: positions implied for outliers may lie anywhere. */
function noteExtremes({ x, y, z, flags }: SampleBlock, { trusted, all }: SampleExtent): void {
  for (const [axis, column] of [x, y, z].entries()) {
    for (let row = 0; row < column.length; row++) {
      const value = column[row];
      if (value < all.min[axis]) all.min[axis] = value;
      if (value > all.max[axis]) all.max[axis] = value;
      if ((flags[row] & EXCLUDED_FROM_GRID) !== 0) continue;
      if (value < trusted.min[axis]) trusted.min[axis] = value;
      if (value > trusted.max[axis]) trusted.max[axis] = value;
    }
  }
}
