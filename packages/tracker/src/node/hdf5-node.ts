import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import type { ByteSource } from '../core/bytes.js';
import type { Hdf5Opener } from '../core/hdf5.js';
import { openHdf5Reader } from '../store/hdf5-reader.js';
import { openFileSink } from './file-sink.js';
import { nodeHdf5Build } from './hdf5-build.js';
import { pathOf } from './source-paths.js';

/** Bytes copied at once when a source is no file. */
const COPY = 1 << 20;

/**
 * HDF5 files for reading in Node. A source of `openFileSource` is opened where it lies; any other is copied to a
 * temporary file first, gone after `close`. Code `dump/not-hdf5`.
 */
export const nodeHdf5: Hdf5Opener = {
  async open(source) {
    const build = await nodeHdf5Build();
    const path = pathOf(source);
    if (path !== null) return openHdf5Reader(build, path, source.name);
    const folder = mkdtempSync(join(tmpdir(), 'wakeloom-hdf5-'));
    const remove = () => rmSync(folder, { recursive: true, force: true });
    try {
      const copy = join(folder, 'dump.h5');
      await copyTo(source, copy);
      return openHdf5Reader(build, copy, source.name, remove);
    } catch (error) {
      remove();
      throw error;
    }
  },
};

async function copyTo(source: ByteSource, path: string): Promise<void> {
  const sink = await openFileSink(path);
  const buffer = new Uint8Array(COPY);
  try {
    for (let position = 0; position < source.size; ) {
      const got = await source.read(position, buffer);
      if (got === 0) break;
      await sink.write(buffer.subarray(0, got));
      position += got;
    }
  } finally {
    await sink.close();
  }
}
