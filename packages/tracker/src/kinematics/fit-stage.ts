import type { LinkedBlock, SampleBlock } from '../core/columns.js';
import type { StageInput } from '../pipeline/stages.js';
import type { FitParameters } from './fit-parameters.js';
import { fitLag, fitParameters } from './fit-parameters.js';
import type { CoreRange } from './fit-window.js';
import { fitWindowInSteps } from './fit-window.js';
import { cutWindows, windowBytes } from './window-cutter.js';

/** Rows of a core at least: enough that handing a window over costs little against fitting it. */
const CORE_ROWS = 60_000;

/** Runs `fitWindow` somewhere, perhaps in a worker thread; the window is given away. */
export type FitRunner = (window: LinkedBlock, core: CoreRange, parameters: FitParameters) => Promise<SampleBlock>;

/**
 * The fit stage: linked blocks in frame order to samples in frame order. Cuts the stream into windows with overlap
 * and has each fitted by `run`, up to `context.budget.threads` at a time and within half the budget of bytes; results come in order and do not depend on
 * the cuts or the threads. Without `run` the kernel works here, with a breath every few ms. Memory: the windows in
 * flight, each three to four times the lag long, about 100 bytes a row.
 */
export async function* fitStage(
  input: StageInput,
  blocks: AsyncIterable<LinkedBlock>,
  run?: FitRunner,
): AsyncGenerator<SampleBlock> {
  const { context } = input;
  const parameters = fitParameters(input.settings, input.prior);
  const runner = run ?? runHere;
  const limit = run === undefined ? 1 : Math.max(1, context.budget.threads);
  const flight: Promise<SampleBlock>[] = [];
  const sizes: number[] = [];
  let held = 0;
  let frames = 0;

  async function runHere(window: LinkedBlock, core: CoreRange, p: FitParameters): Promise<SampleBlock> {
    const steps = fitWindowInSteps(window, core, p);
    for (;;) {
      await context.breathe();
      const step = steps.next();
      if (step.done) return step.value;
    }
  }
  const deliver = async (): Promise<SampleBlock> => {
    const samples = await flight.shift()!;
    held -= sizes.shift()!;
    frames += samples.number.length;
    context.progress('fit', frames, null, 'frames');
    return samples;
  };

  try {
    for await (const { window, core } of cutWindows(blocks, fitLag(parameters), CORE_ROWS)) {
      await context.breathe();
      const bytes = windowBytes(window);
      while (flight.length > 0 && (flight.length >= limit || held + bytes > context.budget.bytes / 2)) {
        yield await deliver();
      }
      const result = runner(window, core, parameters);
      sizes.push(bytes);
      held += bytes;
      // Awaited in its turn; until then a failure must not count as unhandled.
      result.catch(() => {});
      flight.push(result);
    }
    while (flight.length > 0) yield await deliver();
  } finally {
    await Promise.allSettled(flight);
  }
}
