import type { LinkedBlock, SampleBlock } from '../core/columns.js';
import { rowCount } from '../core/columns.js';
import type { RunContext } from '../core/context.js';
import { createFrameFit } from '../kinematics/create-frame-fit.js';
import type { StartRemoteFit } from '../kinematics/fit-stage.js';
import type { FrameFit } from '../kinematics/frame-fit.js';
import type { WorkerClient } from './client.js';
import { type Crate, pack, unpack } from './crate.js';
import type { OperationBodies } from './host.js';
import type { KernelOperations } from './operation-table.js';

/** Buffers kept for use again at most. */
const MOST_SPARES = 6;

/** Samples of an answer at least, where there are more to come after the last frames: at the end much is left at once. */
const ANSWER_ROWS = 60_000;

/** A fit that goes on in this worker. */
interface GoingFit {
  readonly fit: FrameFit;
  /** What it gives after the last frames; null before. */
  rest: ReturnType<FrameFit['finish']> | null;
  readonly spares: ArrayBuffer[];
  /** The call before: each waits for it. */
  done: Promise<void>;
}

/** Body of `fit-frames`, with the fits that go on in the worker. */
export function fitFramesBody(): OperationBodies<KernelOperations, unknown> {
  const fits = new Map<string, GoingFit>();
  return {
    async 'fit-frames'({ fit: name, parameters, frames, spares }, context) {
      const going = fits.get(name) ?? {
        fit: createFrameFit(parameters),
        rest: null,
        spares: [],
        done: Promise.resolve(),
      };
      fits.set(name, going);
      const before = going.done;
      let end = (): void => {};
      going.done = new Promise((resolve) => {
        end = resolve;
      });
      await before;
      try {
        for (const spare of spares) if (going.spares.length < MOST_SPARES) going.spares.push(spare);
        const samples: Crate[] = [];
        const most = frames === null ? ANSWER_ROWS : Number.POSITIVE_INFINITY;
        if (frames === null) going.rest ??= going.fit.finish();
        const steps = frames === null ? going.rest! : going.fit.add(unpack<LinkedBlock>(frames));
        for (let rows = 0; rows < most; ) {
          const { done, value: block } = steps.next();
          if (done) break;
          if (block !== null) {
            rows += rowCount(block);
            samples.push(pack(block, going.spares));
          }
          await context.breathe();
        }
        if (frames === null && samples.length === 0) fits.delete(name);
        const used = frames === null ? [] : [frames.buffer];
        return { value: { samples, spares: used }, transfer: [...samples.map(({ buffer }) => buffer), ...used] };
      } catch (error) {
        fits.delete(name);
        throw error;
      } finally {
        end();
      }
    },
  };
}

/** The fit of a run in another worker. */
export function fitInHelper(helper: WorkerClient<KernelOperations>, context: RunContext): StartRemoteFit {
  return (parameters) => {
    const spares: ArrayBuffer[] = [];
    let back: ArrayBuffer[] = [];
    const call = async (frames: Crate | null): Promise<readonly SampleBlock[]> => {
      const given = back;
      back = [];
      const transfer = frames === null ? given : [frames.buffer, ...given];
      const answer = await helper.run(
        'fit-frames',
        { fit: 'run', parameters, frames, spares: given },
        { signal: context.signal, transfer, bytes: context.budget.bytes },
      );
      for (const spare of answer.spares) if (spares.length < MOST_SPARES) spares.push(spare);
      return answer.samples.map((crate) => unpack<SampleBlock>(crate));
    };
    return {
      frames: (block) => call(pack(withoutUnused(block), spares)),
      rest: () => call(null),
      release(samples) {
        if (back.length < MOST_SPARES) back.push(samples.x.buffer as ArrayBuffer);
      },
    };
  };
}

/** Rows as long as the block says, without the columns that fits do not look at. */
function withoutUnused(block: LinkedBlock): LinkedBlock {
  const rows = block.offsets[block.number.length]!;
  return {
    ...block,
    x: block.x.subarray(0, rows),
    y: block.y.subarray(0, rows),
    z: block.z.subarray(0, block.dims === 3 ? rows : 0),
    row: block.row.subarray(0, rows),
    pathline: block.pathline.subarray(0, rows),
    linkRisk: block.linkRisk.subarray(0, rows),
    brightness: block.brightness.subarray(0, 0),
    given: block.given.subarray(0, 0),
  };
}
