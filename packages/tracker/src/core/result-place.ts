import type * as H5 from 'h5wasm';
import type { HasherFactory, Scratch } from './bytes.js';

/**
 * The HDF5 build in use, handed in because Node's (`h5wasm/node`) and the browser's (`h5wasm`) differ. `module` is
 * what the build's `ready` promise resolved to.
 */
export interface Hdf5Build {
  readonly module: typeof H5.Module;
  readonly File: typeof H5.File;
}

/** Files of a result folder while they are made carry this before their name; nothing so named is a result. */
export const PARTIAL_PREFIX = '.partial-';

/** A file of a result folder open for reading and writing anywhere in it. Throws as its place does. */
export interface PlaceFile {
  /** Fills `into` from `position`; returns the bytes read, fewer only at the end. */
  read(position: number, into: Uint8Array): number;
  /** Writes all of `bytes`, which are borrowed until the promise settles. Several calls may be under way. */
  write(position: number, bytes: Uint8Array): Promise<void>;
  /** Makes the file this long, new bytes being 0; true where their room is taken from now on, false where writing may still find none. */
  setSize(bytes: number): boolean;
  /** What is under way is still written. */
  close(): void;
}

/**
 * Where a result folder's files are made and found: a real folder in Node, a folder of the HDF5 build's
 * in-memory file system in the browser. File names are plain names without separators. Every method throws a
 * WakeloomError (`store/disk-full`, `store/not-writable`, `store/not-a-folder`) that names the path.
 * Calls that give no promise return when done.
 */
export interface ResultPlace {
  /** The folder as the user wrote it, for messages. */
  readonly name: string;
  /** The HDF5 build, loaded when it is first asked for: a run streams without it, and it takes some 35 MB. */
  hdf5(): Promise<Hdf5Build>;
  readonly scratch: Scratch;
  readonly hasher: HasherFactory;
  /**
   * A cheap checksum to hold what was read back against what was written; absent: the digest itself serves. It need not be
   * safe against intent, only against disks.
   */
  readonly checksum?: HasherFactory;
  /** Path under which the HDF5 build opens the file. */
  hdf5Path(file: string): string;
  /** Opens a file that is there. */
  open(file: string): PlaceFile;
  /** Bytes that can still be written, null where the system does not say. */
  freeBytes(): number | null;
  /** Names of the files in the folder, sorted; empty when there is no such folder. */
  files(): readonly string[];
  /** Size in bytes, -1 when there is no such file. */
  size(file: string): number;
  /** Whole file as UTF-8 text; throws `store/not-a-result` when it is not there. */
  readText(file: string): string;
  /** Makes the file anew with this UTF-8 text. */
  writeText(file: string, text: string): void;
  /** Brings the file's bytes to the disk (a no-op in memory). */
  sync(file: string): Promise<void>;
  /** Renames over an existing file of that name; the folder entry is on the disk when it returns. */
  rename(from: string, to: string): void;
  /** Removes the file; no error when there is none. The folder entry is off the disk when it returns. */
  remove(file: string): void;
}
