import type { SampleBlock } from '../core/columns.js';
import { addFrameVelocity } from '../detections/frame-velocity.js';
import { fitStage } from '../kinematics/fit-stage.js';
import type { SampleExtent, Stage } from './board.js';
import { restoreNumbers } from './frame-step.js';

/** Turns linked detections into samples: fit, screening, velocity of a towed frame; notes their extent. */
export const samplesStage: Stage = {
  name: 'fit',
  needs: ['scan', 'look', 'linked'],
  gives: ['samples', 'extent'],
  run(board) {
    const { settings } = board.request.resolved;
    const input = { settings, scan: board.scan!, prior: board.look!.prior, context: board.context };
    const extent: SampleExtent = {
      min: [Number.POSITIVE_INFINITY, Number.POSITIVE_INFINITY, Number.POSITIVE_INFINITY],
      max: [Number.NEGATIVE_INFINITY, Number.NEGATIVE_INFINITY, Number.NEGATIVE_INFINITY],
      samples: 0,
    };
    board.extent = extent;
    const fitted = fitStage(input, board.linked!, board.tools.fit);
    const { frameNumbers } = board.scan!;
    const restore = (block: SampleBlock) => restoreNumbers(block.number, frameNumbers[0], board.look!.prior.frameStep);
    board.samples = finishSamples(fitted, settings.geometry.frame.velocity, restore, extent);
  },
};

async function* finishSamples(
  blocks: AsyncIterable<SampleBlock>,
  frameVelocity: readonly [number, number, number] | null,
  restore: (block: SampleBlock) => void,
  extent: SampleExtent,
): AsyncGenerator<SampleBlock> {
  for await (const block of blocks) {
    restore(block);
    if (frameVelocity !== null) addFrameVelocity(block, frameVelocity);
    extent.samples += block.flags.length;
    for (const [axis, column] of [block.x, block.y, block.z].entries()) {
      for (let row = 0; row < column.length; row++) {
        if (column[row] < extent.min[axis]) extent.min[axis] = column[row];
        if (column[row] > extent.max[axis]) extent.max[axis] = column[row];
      }
    }
    yield block;
  }
}
