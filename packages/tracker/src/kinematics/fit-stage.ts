import type { LinkedBlock, SampleBlock } from '../core/columns.js';
import { rowCount } from '../core/columns.js';
import type { RunContext } from '../core/context.js';
import type { StageInput } from '../pipeline/stages.js';
import { createFrameFit } from './create-frame-fit.js';
import type { FitParameters } from './fit-parameters.js';
import { fitParameters } from './fit-parameters.js';
import type { FrameFit } from './frame-fit.js';

/**
 * Rows that may lie with another thread unanswered: it works through some 200 000 at once (six frames at least) and is
 * to find the next ones waiting then. One block more may be under way.
 */
const ROWS_AHEAD = 400_000;

/** Blocks that may lie there: each call listens to the signal, and Node warns of more than ten listeners. */
const BLOCKS_AHEAD = 9;

/** A fit that goes on in another thread. */
export interface RemoteFit {
  /** Sends the next frames, borrowed until it returns; resolves in order to the samples finished by then. */
  frames(block: LinkedBlock): Promise<readonly SampleBlock[]>;
  /** When all frames were sent: some of the samples that are left. To be called until it resolves to none. */
  rest(): Promise<readonly SampleBlock[]>;
  /** Takes samples back that are done with. */
  release(samples: SampleBlock): void;
}

/** Starts such a fit. */
export type StartRemoteFit = (parameters: FitParameters) => RemoteFit;

/**
 * The fit stage: linked blocks in frame order to samples in frame order. With `start` the fit runs in another thread,
 * while this one reads, links and stores; without it here, with a breath every few ms. The samples are the same.
 * Memory: that of the fit (`RollingFit`), and 32 bytes for each row that lies with the other thread. Samples are borrowed
 * until the next are asked for.
 */
export async function* fitStage(
  input: StageInput,
  blocks: AsyncIterable<LinkedBlock>,
  start?: StartRemoteFit,
): AsyncGenerator<SampleBlock> {
  const { context } = input;
  const parameters = fitParameters(input.settings, input.prior);
  const fitted =
    start === undefined
      ? fitHere(blocks, createFrameFit(parameters), context)
      : fitElsewhere(blocks, start(parameters), context);
  let frames = 0;
  for await (const samples of fitted) {
    frames += samples.number.length;
    context.progress('fit', frames, null, 'frames');
    yield samples;
  }
}

async function* fitHere(
  blocks: AsyncIterable<LinkedBlock>,
  fit: FrameFit,
  context: RunContext,
): AsyncGenerator<SampleBlock> {
  await context.breathe();
  for await (const block of blocks) yield* breathing(fit.add(block), context);
  yield* breathing(fit.finish(), context);
}

async function* breathing(
  steps: Generator<SampleBlock | null, void>,
  context: RunContext,
): AsyncGenerator<SampleBlock> {
  for (const samples of steps) {
    if (samples !== null) yield samples;
    await context.breathe();
  }
}

async function* fitElsewhere(
  blocks: AsyncIterable<LinkedBlock>,
  fit: RemoteFit,
  context: RunContext,
): AsyncGenerator<SampleBlock> {
  const flight: { readonly samples: Promise<readonly SampleBlock[]>; readonly rows: number }[] = [];
  let ahead = 0;
  const send = (block: LinkedBlock): void => {
    const samples = fit.frames(block);
    // Awaited in its turn; until then a failure must not count as unhandled.
    samples.catch(() => {});
    const rows = rowCount(block);
    flight.push({ samples, rows });
    ahead += rows;
  };
  async function* next(): AsyncGenerator<SampleBlock> {
    const { samples, rows } = flight.shift()!;
    const answer = await samples;
    ahead -= rows;
    yield* released(answer, fit);
  }
  try {
    for await (const block of blocks) {
      await context.breathe();
      send(block);
      while (ahead > ROWS_AHEAD || flight.length >= BLOCKS_AHEAD) yield* next();
    }
    while (flight.length > 0) yield* next();
    for (;;) {
      const answer = await fit.rest();
      if (answer.length === 0) break;
      yield* released(answer, fit);
    }
  } finally {
    await Promise.allSettled(flight.map(({ samples }) => samples));
  }
}

function* released(answer: readonly SampleBlock[], fit: RemoteFit): Generator<SampleBlock> {
  for (const samples of answer) {
    yield samples;
    fit.release(samples);
  }
}
