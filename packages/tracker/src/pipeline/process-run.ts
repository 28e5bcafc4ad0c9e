import type { RunContext, RunEvent } from '../core/context.js';
import type { RunRecord } from '../store/run-record.js';
import type { Board, RunRequest, RunTools } from './board.js';
import { runStages, STAGES } from './list.js';

/**
 * Works one run from dump to complete result folder and resolves to run.json. Everything else about the run is in
 * the folder. Memory: particles in view, the grid, and about 60 MB for the store; not the number of frames.
 *
 * Throws coded errors (`dump/...`, `geometry/...`, `linking/...`, `grid/...`, `store/...`, `run/aborted`); after any
 * of them the folder is what it was before: no result, or the earlier complete one.
 */
export async function processRun(request: RunRequest, tools: RunTools, context: RunContext): Promise<RunRecord> {
  const events: RunEvent[] = [];
  const noting: RunContext = {
    ...context,
    event(event) {
      events.push(event);
      context.event(event);
    },
  };
  const board: Board = { request, tools, context: noting, events, seconds: {} };
  await runStages(STAGES, board);
  return board.record!;
}
