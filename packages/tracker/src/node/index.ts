export { openFileSink } from './file-sink.js';
export { openFileSource } from './file-source.js';
export { nodeHasher } from './hasher.js';
export { nodeHdf5 } from './hdf5-node.js';
export { processInWorker, type WorkerRunOptions } from './process-in-worker.js';
export { openNodeResultPlace } from './result-place-node.js';
export { nodeScratch } from './scratch.js';
