// A worker of the tests only: the tracker's own host, with operations that spin, crash, exit and exhaust.
// It runs from `dist`, as every worker thread does. Signatures: fault-operations.ts.
import { parentPort, threadId } from 'node:worker_threads';
import { WakeloomError } from '@wakeloom/tracker';
import { serveOperations } from '@wakeloom/tracker/workers/host';
import { buffersOf } from '@wakeloom/tracker/workers/transfer';
import nodeEndpoint from 'comlink/dist/esm/node-adapter.mjs';

const never = () => new Promise(() => {});

async function spin({ milliseconds, breathes }, context) {
  const end = performance.now() + milliseconds;
  let turns = 0;
  while (performance.now() < end) {
    turns++;
    context.progress('spin', turns, null, 'turns');
    if (breathes) await context.breathe();
  }
  return { value: turns, transfer: [] };
}

const bodies = {
  spin,
  'double-all': ({ numbers }) => {
    const doubled = numbers.map((value) => 2 * value);
    return { value: { doubled, thread: threadId }, transfer: buffersOf(doubled) };
  },
  'wait-then-name': async ({ name, milliseconds }) => {
    await new Promise((resolve) => setTimeout(resolve, milliseconds));
    return { value: { name, thread: threadId }, transfer: [] };
  },
  'fail-coded': ({ row }) => {
    throw new WakeloomError('dump/empty', `dump: got ${row} rows, expected at least 1 (test)`, {
      row,
      list: [1, 'two'],
    });
  },
  'fail-plain': () => {
    throw new TypeError('not a function of ours');
  },
  report: (_, context) => {
    for (let i = 1; i <= 1000; i++) context.progress('count', i, 1000, 'frames');
    for (let i = 0; i < 50; i++) {
      context.event({ code: 'dump/note', level: 'note', message: `note ${i}`, details: { i } });
    }
    return {
      value: { bytes: context.budget.bytes, threads: context.budget.threads, seed: context.seed('a') },
      transfer: [],
    };
  },
  'crash-in-timer': () => {
    setTimeout(() => {
      throw new Error('thrown from a timer');
    }, 1);
    return never();
  },
  'crash-in-promise': () => {
    void Promise.reject(new Error('rejected and unhandled'));
    return never();
  },
  exit: ({ exitCode }) => {
    process.exit(exitCode);
  },
  'exhaust-heap': async () => {
    const kept = [];
    for (;;) kept.push(new Array(1000).fill(kept.length));
  },
  'exhaust-buffers': ({ typed }) => {
    const bytes = typed ? new Float64Array(2 ** 33).byteLength : new ArrayBuffer(2 ** 46).byteLength;
    return { value: bytes, transfer: [] };
  },
  'wrong-length': () => ({ value: new Float64Array(-1).byteLength, transfer: [] }),
  'return-function': () => ({ value: () => 1, transfer: [] }),
};

serveOperations(bodies, null, nodeEndpoint(parentPort));
