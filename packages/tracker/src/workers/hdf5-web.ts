import type { ByteSource } from '../core/bytes.js';
import { WakeloomError } from '../core/errors.js';
import type { Hdf5Opener } from '../core/hdf5.js';
import type { Hdf5Build } from '../core/result-place.js';
import { openHdf5Reader } from '../store/hdf5-reader.js';

/** Bytes of a source that is no local file and must be copied into memory; WebAssembly memory ends at 2 GB. */
const COPY_LIMIT = 1024 * 1024 * 1024;

/** What WORKERFS is mounted with; the typings of the build leave its file systems out. */
interface MountableFileSystems {
  readonly filesystems: { readonly WORKERFS: Parameters<Hdf5Build['module']['FS']['mount']>[0] };
}

/**
 * The browser's HDF5 build, 4.2 MB: fetched when first asked for, a second call gives the same. Workers only, since
 * local files are read synchronously.
 */
export async function loadWebHdf5(): Promise<Hdf5Build> {
  const { ready, File } = await import('h5wasm');
  return { module: await ready, File };
}

/**
 * HDF5 files for reading in a web worker. A source of `blobSource` is mounted and read in place, whatever its size;
 * any other is copied into memory first. Codes `dump/not-hdf5`, `dump/too-large-for-memory`.
 */
export function createWebHdf5Opener(): Hdf5Opener {
  let opened = 0;
  return {
    async open(source) {
      const build = await loadWebHdf5();
      const fileSystem = build.module.FS;
      const folder = `/dump-${++opened}`;
      const path = `${folder}/dump.h5`;
      fileSystem.mkdirTree(folder);
      if (hasBlob(source)) {
        const { WORKERFS } = (fileSystem as unknown as MountableFileSystems).filesystems;
        fileSystem.mount(WORKERFS, { blobs: [{ name: 'dump.h5', data: source.blob }] }, folder);
        return openOrClean(build, path, source.name, () => {
          fileSystem.unmount(folder);
          fileSystem.rmdir(folder);
        });
      }
      fileSystem.writeFile(path, await wholeSource(source));
      return openOrClean(build, path, source.name, () => {
        fileSystem.unlink(path);
        fileSystem.rmdir(folder);
      });
    },
  };
}

function hasBlob(source: ByteSource): source is ByteSource & { readonly blob: Blob } {
  return 'blob' in source && source.blob instanceof Blob;
}

function openOrClean(build: Hdf5Build, path: string, name: string, clean: () => void) {
  try {
    return openHdf5Reader(build, path, name, clean);
  } catch (error) {
    clean();
    throw error;
  }
}

async function wholeSource(source: ByteSource): Promise<Uint8Array> {
  if (source.size > COPY_LIMIT) {
    throw new WakeloomError(
      'dump/too-large-for-memory',
      `HDF5 dump "${source.name}": got ${source.size} bytes that are no local file, expected at most ${COPY_LIMIT}; unpack it first or use the wakeloom command`,
      { file: source.name, bytes: source.size, limit: COPY_LIMIT },
    );
  }
  const bytes = new Uint8Array(source.size);
  let done = 0;
  while (done < bytes.length) {
    const got = await source.read(done, bytes.subarray(done));
    if (got === 0) break;
    done += got;
  }
  return bytes.subarray(0, done);
}
