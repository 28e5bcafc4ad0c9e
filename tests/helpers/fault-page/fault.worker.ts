// A web worker of the tests only: the tracker's own host, with operations that spin, crash and exhaust.
import { WakeloomError } from '@wakeloom/tracker';
import { serveOperations } from '@wakeloom/tracker/workers/host';
import { buffersOf } from '@wakeloom/tracker/workers/transfer';
import type { Endpoint } from 'comlink';
import type { WebFaultOperations } from './operations.js';

serveOperations<WebFaultOperations, null>(
  {
    async spin({ milliseconds, breathes }, context) {
      const end = performance.now() + milliseconds;
      let turns = 0;
      while (performance.now() < end) {
        turns++;
        context.progress('spin', turns, null, 'turns');
        if (breathes) await context.breathe();
      }
      return { value: turns, transfer: [] };
    },
    'double-all'({ numbers }) {
      const doubled = numbers.map((value) => 2 * value);
      return { value: doubled, transfer: buffersOf(doubled) };
    },
    'crash-in-timer'() {
      setTimeout(() => {
        throw new Error('thrown from a timer');
      }, 1);
      return new Promise(() => {});
    },
    // The largest power of two that Chromium takes for a length and then finds no room for.
    'exhaust-buffers': () => ({ value: new ArrayBuffer(2 ** 34).byteLength, transfer: [] }),
    'fail-coded'() {
      throw new WakeloomError('dump/empty', 'dump: got 0 rows, expected at least 1 (test)', { row: 0 });
    },
    'return-function': () => ({ value: () => 1, transfer: [] }),
  },
  null,
  self as unknown as Endpoint,
);
