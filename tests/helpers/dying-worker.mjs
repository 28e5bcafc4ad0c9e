// A worker of the tests only: the tracker's own operations on the tracker's own files, in a thread that dies at a
// chosen point of a run. The manner stands in the environment, which threads inherit. It runs from `dist`.
import { parentPort } from 'node:worker_threads';
import { nodeHasher, nodeHdf5, openFileSource, openNodeResultPlace } from '@wakeloom/tracker/node';
import { startNodeWorker } from '@wakeloom/tracker/node/threads';
import { serveOperations } from '@wakeloom/tracker/workers/host';
import { runBodies } from '@wakeloom/tracker/workers/operations';
import nodeEndpoint from 'comlink/dist/esm/node-adapter.mjs';

const manner = process.env.DYING_MANNER ?? '';
const HEAP_MB = 48;

function die(how) {
  if (how === 'exit') process.exit(3);
  if (how === 'crash') {
    setTimeout(() => {
      throw new Error('thrown from a timer');
    }, 1);
    return new Promise(() => {});
  }
  const kept = [];
  for (;;) kept.push(new Array(1000).fill(kept.length));
}

/** A place whose thread dies at the first call of one of its methods. */
async function dyingPlace(out, method, how) {
  const place = await openNodeResultPlace(out, { create: true });
  return { ...place, [method]: () => die(how) };
}

const platform = {
  openSource: (ref) => openFileSource(ref.path),
  openPlace(out) {
    if (manner === 'coordinator-exit-before-writing') return dyingPlace(out, 'hdf5Path', 'exit');
    if (manner === 'coordinator-exit-before-rename') return dyingPlace(out, 'rename', 'exit');
    if (manner === 'coordinator-crash-in-sync') return dyingPlace(out, 'sync', 'crash');
    return openNodeResultPlace(out, { create: true });
  },
  hasher: async () => nodeHasher,
  hdf5: async () => nodeHdf5,
  startHelper(name) {
    process.env.DYING_MANNER = manner.replace('helper', 'fitting');
    const resourceLimits = { maxOldGenerationSizeMb: HEAP_MB };
    return startNodeWorker({ name, entry: new URL(import.meta.url), resourceLimits });
  },
  host: { name: 'test', platform: 'test', runtime: 'test' },
};

let calls = 0;
const dyingBodies = {
  ...runBodies,
  'fit-frames': (args, context) =>
    manner.startsWith('fitting-') && ++calls === 2
      ? die(manner.slice('fitting-'.length))
      : runBodies['fit-frames'](args, context, platform),
};

serveOperations(dyingBodies, platform, nodeEndpoint(parentPort));
