import { hostname } from 'node:os';
import { parentPort } from 'node:worker_threads';
import nodeEndpoint from 'comlink/dist/esm/node-adapter.mjs';
import { WakeloomError } from '../core/errors.js';
import { startNodeWorker } from '../node/threads.js';
import { serveOperations } from './host.js';
import { type Platform, runBodies } from './operations.js';

// The script of every worker thread in Node. What only a coordinator needs is loaded when it is needed.
const platform: Platform = {
  async openSource(ref) {
    if (ref.kind !== 'path') {
      throw new WakeloomError('usage/source', `dump file: got a ${ref.kind}, expected a path (worker thread)`);
    }
    const { openFileSource } = await import('../node/file-source.js');
    return openFileSource(ref.path);
  },
  async openPlace(out) {
    const { openNodeResultPlace } = await import('../node/result-place-node.js');
    return openNodeResultPlace(out, { create: true });
  },
  async hasher() {
    const { nodeHasher } = await import('../node/hasher.js');
    return nodeHasher;
  },
  async hdf5() {
    const { nodeHdf5 } = await import('../node/hdf5-node.js');
    return nodeHdf5;
  },
  startHelper: (name) => startNodeWorker({ name, entry: new URL(import.meta.url) }),
  host: { name: hostname(), platform: `${process.platform} ${process.arch}`, runtime: `node ${process.version}` },
};

if (parentPort === null) {
  throw new WakeloomError('usage/not-a-worker', 'entry-node: got the main thread, expected a worker thread');
}
serveOperations(runBodies, platform, nodeEndpoint(parentPort));
