import type { HasherFactory } from '../core/bytes.js';
import { WakeloomError } from '../core/errors.js';
import type { Hdf5Build, PlaceFile, ResultPlace } from '../core/result-place.js';
import { createMemoryScratch } from './web-scratch.js';

/** A result folder in the memory of a worker. */
export interface MemoryResultPlace extends ResultPlace {
  /** A copy of the file, for the caller to keep or to transfer. Code `store/not-a-result` when it is not there. */
  bytes(file: string): Uint8Array<ArrayBuffer>;
  /** Removes the folder with all its files. */
  discard(): void;
}

/**
 * A result folder in the HDF5 build's in-memory file system, for browsers: files and, counted apart, scratch hold
 * at most `limitBytes` each. Writing beyond it ends with the store's own `store/disk-full`, or `store/scratch-full`.
 */
export function createMemoryResultPlace(
  hdf5: Hdf5Build,
  hasher: HasherFactory,
  name: string,
  limitBytes: number,
): MemoryResultPlace {
  const fileSystem = hdf5.module.FS;
  const folder = `/${name}`;
  fileSystem.mkdirTree(folder);
  const path = (file: string): string => `${folder}/${file}`;
  const files = (): string[] => {
    const names = fileSystem.readdir(folder) as string[];
    return names.filter((file) => file !== '.' && file !== '..').sort();
  };
  const size = (file: string): number => {
    if (!fileSystem.analyzePath(path(file)).exists) return -1;
    return (fileSystem.stat(path(file)) as { size: number }).size;
  };
  const bytes = (file: string): Uint8Array<ArrayBuffer> => {
    if (size(file) < 0) {
      throw new WakeloomError(
        'store/not-a-result',
        `result folder: got no ${file}, expected the files of a finished run (${name}); process the run first`,
        { path: path(file) },
      );
    }
    // The build's own copy; slice() in case a later version hands out a view of its memory.
    return fileSystem.readFile(path(file)).slice();
  };
  return {
    name,
    hdf5: () => Promise.resolve(hdf5),
    hasher,
    scratch: createMemoryScratch(limitBytes),
    hdf5Path: path,
    open: (file) => openMemoryFile(fileSystem, path(file)),
    freeBytes: () => Math.max(0, limitBytes - files().reduce((sum, file) => sum + size(file), 0)),
    files,
    size,
    readText: (file) => new TextDecoder().decode(bytes(file)),
    writeText: (file, text) => fileSystem.writeFile(path(file), new TextEncoder().encode(text)),
    sync: () => Promise.resolve(),
    rename(from, to) {
      if (size(to) >= 0) fileSystem.unlink(path(to));
      fileSystem.rename(path(from), path(to));
    },
    remove(file) {
      if (size(file) >= 0) fileSystem.unlink(path(file));
    },
    bytes,
    discard() {
      for (const file of files()) fileSystem.unlink(path(file));
      fileSystem.rmdir(folder);
    },
  };
}

/** What we use of the build's file system; its typings leave most of it out. */
interface MemoryFiles {
  open(path: string, flags: string): object;
  read(stream: object, into: Uint8Array, offset: number, length: number, position: number): number;
  write(stream: object, bytes: Uint8Array, offset: number, length: number, position: number): number;
  truncate(path: string, bytes: number): void;
  close(stream: object): void;
}

function openMemoryFile(fileSystem: Hdf5Build['module']['FS'], path: string): PlaceFile {
  const files = fileSystem as unknown as MemoryFiles;
  const stream = files.open(path, 'r+');
  let open = true;
  return {
    read: (position, into) => files.read(stream, into, 0, into.length, position),
    async write(position, bytes) {
      files.write(stream, bytes, 0, bytes.length, position);
    },
    setSize(bytes) {
      files.truncate(path, bytes);
      return true;
    },
    close() {
      if (!open) return;
      open = false;
      files.close(stream);
    },
  };
}
