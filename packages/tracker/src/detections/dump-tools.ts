import type { HasherFactory } from '../core/bytes.js';
import type { Hdf5Opener } from '../core/hdf5.js';

/** What reading needs from its surroundings: Node and the browser hand in their own. */
export interface DumpTools {
  /** Streaming SHA-256. */
  readonly hasher: HasherFactory;
  /** The HDF5 build, or null where there is none: HDF5 dumps then end with `dump/no-hdf5-reader`. */
  readonly hdf5: Hdf5Opener | null;
  /** Bytes that putting rows in frame order may take. */
  readonly ramLimit: number;
}
