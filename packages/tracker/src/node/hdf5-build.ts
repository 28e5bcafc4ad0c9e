import { openSync } from 'node:fs';
import { devNull } from 'node:os';
import type { Hdf5Build } from '../core/result-place.js';

/** What we touch of the build's file system: the stream behind its standard error. */
interface Streams {
  readonly streams?: readonly ({ nfd?: number } | null | undefined)[];
}

let quiet = false;

/**
 * The HDF5 build for Node, ready. Its own error stacks (a page for every failed call, to standard error) go nowhere:
 * what fails shows in return values and in the read-back, and is said in our words.
 */
export async function nodeHdf5Build(): Promise<Hdf5Build> {
  const h5wasm = await import('h5wasm/node');
  const module = await h5wasm.ready;
  if (!quiet) {
    const stream = (module.FS as unknown as Streams).streams?.[2];
    if (typeof stream?.nfd === 'number') stream.nfd = openSync(devNull, 'w');
    quiet = true;
  }
  return { module, File: h5wasm.File };
}
