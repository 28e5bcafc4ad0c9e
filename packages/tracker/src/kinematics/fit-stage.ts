import type { LinkedBlock, SampleBlock } from '../core/columns.js';
import type { RunContext } from '../core/context.js';
import type { StageInput } from '../pipeline/stages.js';
import type { FitParameters } from './fit-parameters.js';
import { fitLag, fitParameters } from './fit-parameters.js';
import { FitSpace } from './fit-space.js';
import type { CoreRange } from './fit-window.js';
import { fitWindowInSteps } from './fit-window.js';
import { copyBlock } from './rolling-frames.js';
import type { FitTask } from './window-cutter.js';
import { cutWindows, windowBytes } from './window-cutter.js';

/** Rows of a core at least: enough that handing a window over costs little against fitting it. */
const CORE_ROWS = 60_000;

/** Runs `fitWindow` somewhere, perhaps in a worker thread; the window is given away. */
export type FitRunner = (window: LinkedBlock, core: CoreRange, parameters: FitParameters) => Promise<SampleBlock>;

/**
 * The fit stage: linked blocks in frame order to samples in frame order. Cuts the stream into windows with overlap
 * and has each fitted by `run`, up to `context.budget.threads` at a time and within half the budget of bytes; results come in order and do not depend on
 * the cuts or the threads. Without `run` the kernel works here, with a breath every few ms. Memory: the windows in
 * flight, each three to four times the lag long, about 120 bytes a row.
 */
export async function* fitStage(
  input: StageInput,
  blocks: AsyncIterable<LinkedBlock>,
  run?: FitRunner,
): AsyncGenerator<SampleBlock> {
  const { context } = input;
  const parameters = fitParameters(input.settings, input.prior);
  const windows = cutWindows(blocks, fitLag(parameters), CORE_ROWS);
  const fitted = run === undefined ? fitHere(windows, parameters, context) : farmOut(windows, parameters, context, run);
  let frames = 0;
  for await (const samples of fitted) {
    frames += samples.number.length;
    context.progress('fit', frames, null, 'frames');
    yield samples;
  }
}

/** One window after the other, on views of the held frames. */
async function* fitHere(
  windows: AsyncIterable<FitTask>,
  parameters: FitParameters,
  context: RunContext,
): AsyncGenerator<SampleBlock> {
  const space = new FitSpace();
  for await (const { window, core } of windows) {
    const steps = fitWindowInSteps(window, core, parameters, space);
    for (;;) {
      await context.breathe();
      const step = steps.next();
      if (step.done) {
        yield step.value;
        break;
      }
    }
  }
}

/** Copies of windows to `run`, results in order. */
async function* farmOut(
  windows: AsyncIterable<FitTask>,
  parameters: FitParameters,
  context: RunContext,
  run: FitRunner,
): AsyncGenerator<SampleBlock> {
  const flight: { readonly result: Promise<SampleBlock>; readonly bytes: number }[] = [];
  let held = 0;
  const deliver = async (): Promise<SampleBlock> => {
    const { result, bytes } = flight.shift()!;
    held -= bytes;
    return result;
  };
  try {
    for await (const { window, core } of windows) {
      await context.breathe();
      const bytes = windowBytes(window);
      while (
        flight.length > 0 &&
        (flight.length >= context.budget.threads || held + bytes > context.budget.bytes / 2)
      ) {
        yield await deliver();
      }
      const result = run(copyBlock(window), core, parameters);
      // Awaited in its turn; until then a failure must not count as unhandled.
      result.catch(() => {});
      flight.push({ result, bytes });
      held += bytes;
    }
    while (flight.length > 0) yield await deliver();
  } finally {
    await Promise.allSettled(flight.map(({ result }) => result));
  }
}
