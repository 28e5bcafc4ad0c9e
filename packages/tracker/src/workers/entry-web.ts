import type { Endpoint } from 'comlink';
import { WakeloomError } from '../core/errors.js';
import { serveOperations } from './host.js';
import { type PagePlatform, pageBodies } from './page-operations.js';
import { webWorkerHandle } from './start-web.js';
import { blobSource } from './web-blob-source.js';
import type { MemoryResultPlace } from './web-result-place.js';

// The script of every web worker. HDF5 and all else that only a coordinator needs is loaded when it is needed.

/** Bytes that a result in the worker's memory may take, and its scratch besides; WebAssembly memory ends at 2 GB. */
const RESULT_LIMIT = 1024 * 1024 * 1024;

let last: MemoryResultPlace | null = null;

const platform: PagePlatform = {
  openSource(ref) {
    if (ref.kind === 'blob') return Promise.resolve(blobSource(ref.blob, ref.name));
    const message = `dump file: got a ${ref.kind}, expected a file chosen in the page (web worker)`;
    return Promise.reject(new WakeloomError('usage/source', message));
  },
  async openPlace(out) {
    const [{ loadWebHdf5 }, { createMemoryResultPlace }] = await Promise.all([
      import('./hdf5-web.js'),
      import('./web-result-place.js'),
    ]);
    const [hdf5, hasher] = await Promise.all([loadWebHdf5(), platform.hasher()]);
    last?.discard();
    last = createMemoryResultPlace(hdf5, hasher, out, RESULT_LIMIT);
    return last;
  },
  async hasher() {
    const { createWebHasherFactory } = await import('./web-hasher.js');
    return createWebHasherFactory();
  },
  async hdf5() {
    const { createWebHdf5Opener } = await import('./hdf5-web.js');
    return createWebHdf5Opener();
  },
  startHelper: (name) => webWorkerHandle(new Worker(self.location.href, { type: 'module', name }), name),
  host: { name: 'browser', platform: navigator.platform, runtime: navigator.userAgent },
  lastPlace: () => last,
};

// A rejection that nobody awaits would go unnoticed by the page; thrown from a timer it counts as a crash.
self.addEventListener('unhandledrejection', (event) => {
  setTimeout(() => {
    throw event.reason;
  });
});

serveOperations(pageBodies, platform, self as unknown as Endpoint);
