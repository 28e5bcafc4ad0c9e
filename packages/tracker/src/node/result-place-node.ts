import {
  closeSync,
  fsyncSync,
  ftruncateSync,
  mkdirSync,
  openSync,
  readdirSync,
  readFileSync,
  readSync,
  renameSync,
  rmSync,
  statfsSync,
  statSync,
  write,
  writeFileSync,
} from 'node:fs';
import { open } from 'node:fs/promises';
import { join } from 'node:path';
import { WakeloomError } from '../core/errors.js';
import type { PlaceFile, ResultPlace } from '../core/result-place.js';
import { writeError } from './file-errors.js';
import { nodeChecksum, nodeHasher } from './hasher.js';
import { nodeHdf5Build } from './hdf5-build.js';
import { nodeScratch } from './scratch.js';

/**
 * A result folder on the disk. With `create` it is made when missing (parents too). Without, a missing folder is a
 * place without files. Codes: `store/not-a-folder`, `store/not-writable`, `store/disk-full`.
 */
export async function openNodeResultPlace(folder: string, options: { create: boolean }): Promise<ResultPlace> {
  const guard = <T>(path: string, need: number, work: () => T): T => {
    try {
      return work();
    } catch (error) {
      throw writeError(error, path, need);
    }
  };
  if (options.create) guard(folder, 0, () => mkdirSync(folder, { recursive: true }));
  const path = (file: string) => join(folder, file);
  return {
    name: folder,
    hdf5: nodeHdf5Build,
    scratch: nodeScratch(folder),
    hasher: nodeHasher,
    checksum: nodeChecksum,
    hdf5Path: path,
    open: (file) => openPlaceFile(path(file), guard),
    freeBytes() {
      try {
        const { bavail, bsize } = statfsSync(folder);
        return bavail * bsize;
      } catch {
        // Some network file systems do not answer; HDF5's read-back then is the guard.
        return null;
      }
    },
    files() {
      try {
        return readdirSync(folder).sort();
      } catch (error) {
        if ((error as NodeJS.ErrnoException).code === 'ENOENT') return [];
        throw writeError(error, folder);
      }
    },
    size(file) {
      return statSync(path(file), { throwIfNoEntry: false })?.size ?? -1;
    },
    readText(file) {
      try {
        return readFileSync(path(file), 'utf8');
      } catch (error) {
        const message = `result folder: got no readable ${file}, expected the folder of a finished run (${folder}); process the run first`;
        throw new WakeloomError('store/not-a-result', message, { path: path(file) }, error);
      }
    },
    writeText: (file, text) => guard(path(file), text.length, () => writeFileSync(path(file), text)),
    async sync(file) {
      try {
        const handle = await open(path(file), 'r+');
        try {
          await handle.sync();
        } finally {
          await handle.close();
        }
      } catch (error) {
        throw writeError(error, path(file));
      }
    },
    rename(from, to) {
      guard(path(to), 0, () => renameSync(path(from), path(to)));
      syncFolder(folder);
    },
    remove(file) {
      if (statSync(path(file), { throwIfNoEntry: false }) === undefined) return;
      guard(path(file), 0, () => rmSync(path(file), { force: true }));
      syncFolder(folder);
    },
  };
}

type Guard = <T>(path: string, need: number, work: () => T) => T;

function openPlaceFile(path: string, guard: Guard): PlaceFile {
  const descriptor = guard(path, 0, () => openSync(path, 'r+'));
  let writing = 0;
  let open = true;
  // Never under a write: its number may belong to another file by then.
  const closeWhenIdle = () => {
    if (!open && writing === 0) closeSync(descriptor);
  };
  return {
    read: (position, into) =>
      guard(path, 0, () => {
        let done = 0;
        while (done < into.length) {
          const got = readSync(descriptor, into, done, into.length - done, position + done);
          if (got === 0) break;
          done += got;
        }
        return done;
      }),
    async write(position, bytes) {
      writing++;
      try {
        // A disk that fills takes a part and says so only at the next call.
        for (let done = 0; done < bytes.length; ) done += await writeSome(descriptor, bytes, done, position + done);
      } catch (error) {
        throw writeError(error, path, bytes.length);
      } finally {
        writing--;
        closeWhenIdle();
      }
    },
    setSize(bytes) {
      guard(path, bytes, () => ftruncateSync(descriptor, bytes));
      return false;
    },
    close() {
      if (!open) return;
      open = false;
      guard(path, 0, closeWhenIdle);
    },
  };
}

/** One call of the system, in a thread of Node's own: the caller goes on meanwhile. */
function writeSome(descriptor: number, bytes: Uint8Array, from: number, position: number): Promise<number> {
  return new Promise((resolve, reject) => {
    write(descriptor, bytes, from, bytes.length - from, position, (error, written) => {
      if (error === null) resolve(written);
      else reject(error);
    });
  });
}

/** Brings the folder's entries to the disk. Windows cannot open folders; its file system journals them. */
function syncFolder(folder: string): void {
  if (process.platform === 'win32') return;
  const descriptor = openSync(folder, 'r');
  try {
    fsyncSync(descriptor);
  } finally {
    closeSync(descriptor);
  }
}
