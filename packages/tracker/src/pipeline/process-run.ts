import type { RunContext } from '../core/context.js';
import type { RunRecord } from '../store/run-record.js';
import type { Board, RunRequest, RunTools, TimedEvent } from './board.js';
import { runStages, STAGES } from './list.js';

/**
 * Works one run from dump to complete result folder and resolves to run.json. Everything else about the run is in
 * the folder. Memory: particles in view, the grid, and about 60 MB for the store; not the number of frames.
 *
 * Throws coded errors (`dump/...`, `geometry/...`, `linking/...`, `grid/...`, `store/...`, `run/aborted`); after any
 * of them the folder is what it was before: no result, or the earlier complete one.
 */
export async function processRun(request: RunRequest, tools: RunTools, context: RunContext): Promise<RunRecord> {
  const { clock } = tools;
  const started = { at: clock.now(), seconds: clock.seconds() };
  const events: TimedEvent[] = [];
  const noting: RunContext = {
    ...context,
    event(event) {
      events.push({ seconds: Math.round(1000 * (clock.seconds() - started.seconds)) / 1000, ...event });
      context.event(event);
    },
  };
  const board: Board = { request, tools, context: noting, started, events, seconds: {} };
  noting.event({
    code: 'run/started',
    level: 'info',
    message: `${request.resolved.settings.run}, version ${request.programVersion}, at ${started.at}`,
    details: { version: request.programVersion, started: started.at, threads: context.budget.threads },
  });
  await runStages(STAGES, board);
  return board.record!;
}
