import { createWorkerClient } from '@wakeloom/tracker/workers/client';
import { webWorkerHandle } from '@wakeloom/tracker/workers/start-web';

/** Processes the dump at this address in a fresh worker, with these settings; resolves to the record. */
globalThis.processDump = async (address, request) => {
  const blob = await (await fetch(address)).blob();
  const worker = new Worker(new URL('./tracker.worker.js', import.meta.url), { type: 'module', name: 'tracker' });
  const client = createWorkerClient(webWorkerHandle(worker, 'tracker'));
  try {
    const sources = [{ kind: 'blob', blob, name: 'made.csv' }];
    return await client.run('process', { request, sources, out: 'result' });
  } finally {
    await client.terminate();
  }
};
