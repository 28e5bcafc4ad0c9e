import type { ByteSource } from './bytes.js';

/** Numeric storage types we write and read. `i64` values travel as Float64Array of whole numbers below 2^53. */
export type Hdf5Type = 'f32' | 'f64' | 'u8' | 'u16' | 'i32' | 'i64';

export type NumericArray =
  | Float32Array
  | Float64Array
  | Int8Array
  | Uint8Array
  | Int16Array
  | Uint16Array
  | Int32Array
  | Uint32Array;

/** A dataset open for reading. Compound tables appear as one dataset per member (`path` then ends in `:member`). */
export interface Hdf5Dataset {
  readonly path: string;
  readonly shape: readonly number[];
  /** Rows start .. end - 1 of the first dimension (all of the others), in the smallest of our arrays that holds them. */
  rows(start: number, end: number): NumericArray;
  attribute(name: string): string | number | readonly number[] | null;
}

/** An HDF5 file open for reading. */
export interface Hdf5Reader {
  /** Paths of all numeric datasets below `group`, sorted. */
  datasets(group?: string): readonly string[];
  dataset(path: string): Hdf5Dataset | null;
  attribute(name: string): string | number | readonly number[] | null;
  close(): void;
}

/** The HDF5 build, handed in because Node's and the browser's differ (`node/hdf5-node.ts`, `workers/hdf5-web.ts`). */
export interface Hdf5Opener {
  /** Throws `dump/not-hdf5` when the bytes are no HDF5 file. */
  open(source: ByteSource): Promise<Hdf5Reader>;
}
