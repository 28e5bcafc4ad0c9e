import type { Board, Stage } from './board.js';
import { samplesStage } from './stage-fit.js';
import { linkStage } from './stage-link.js';
import { detectionsStage, lookStage, scanStage } from './stage-read.js';
import { storeStage } from './stage-store.js';

/**
 * The stages in the order of the data. The middle ones only open a stream; the store stage draws it, so that one
 * block after the other passes through all of them and memory does not grow with the run.
 */
export const STAGES: readonly Stage[] = [scanStage, lookStage, detectionsStage, linkStage, samplesStage, storeStage];

/** Runs stages one after the other, checking that each finds what it needs. */
export async function runStages(stages: readonly Stage[], board: Board): Promise<void> {
  for (const stage of stages) {
    const missing = stage.needs.filter((key) => board[key] === undefined);
    if (missing.length > 0) {
      throw new Error(`stage "${stage.name}" needs ${missing.join(', ')}, which no earlier stage gave`);
    }
    const started = board.tools.clock.seconds();
    await stage.run(board);
    if (stage.timed) board.seconds[stage.name] = board.tools.clock.seconds() - started;
  }
}
