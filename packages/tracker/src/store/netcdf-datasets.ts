import type * as H5 from 'h5wasm';
import type { Hdf5Type } from '../core/hdf5.js';
import type { Hdf5Build } from '../core/result-place.js';
import { type AttributeValue, TYPE_SIZE } from './digest.js';

/** Rows a chunk holds at most: 32 kB of Float64, so that one instant or one pathline costs few bytes over HTTP. */
export const CHUNK_ROWS = 4096;

/** Bytes a chunk holds at most where rows are long (planes of a grid): what HDF5 caches by default for a dataset. */
const CHUNK_BYTES = 1 << 20;

/** Values that cross into the HDF5 build's memory at once, bytes, unless one row is longer. */
export const WINDOW = 1 << 20;

const DTYPE: Readonly<Record<Hdf5Type, string>> = { f32: '<f', f64: '<d', u8: '<B', u16: '<H', i32: '<i', i64: '<q' };

/** What an attribute can be given to: a dataset or the file. */
export type AttributeTarget = Pick<H5.Dataset, 'create_attribute'>;

/** Where a slab of rows goes: whole rows of the first dimension. */
export interface Slab {
  readonly file: bigint;
  readonly name: string;
  readonly shape: readonly number[];
  readonly first: number;
  readonly rows: number;
}

/**
 * A dataset of this shape without values, little-endian, uncompressed, attribute order tracked. Chunked and grown from
 * zero rows: this build makes a contiguous dataset only from all its values at once.
 */
export function createEmpty(
  hdf5: Hdf5Build,
  file: bigint,
  name: string,
  type: Hdf5Type,
  shape: readonly number[],
): void {
  const float = type === 'f32' || type === 'f64';
  const rowBytes = TYPE_SIZE[type] * shape.slice(1).reduce((product, size) => product * size, 1);
  const most = Math.max(1, Math.min(CHUNK_ROWS, Math.floor(CHUNK_BYTES / Math.max(1, rowBytes))));
  const chunks = shape.map((size, index) => Math.max(1, index === 0 ? Math.min(most, size) : size));
  const metadata = {
    type: float ? 1 : 0,
    size: TYPE_SIZE[type],
    signed: type === 'i32' || type === 'i64',
    vlen: false,
    littleEndian: true,
    total_size: 0,
    shape: shape.map((size, index) => (index === 0 ? 0n : BigInt(size))),
    maxshape: shape.map((size) => BigInt(Math.max(size, 1))),
    chunks: chunks.map(BigInt),
    compression: 0,
    compression_opts: [],
    track_order: true,
  };
  // An address is needed although no row is written yet.
  const nothing = hdf5.module._malloc(8);
  hdf5.module.create_dataset(file, `/${name}`, BigInt(nothing), metadata);
  hdf5.module._free(nothing);
  hdf5.module.resize_dataset(file, `/${name}`, shape.map(BigInt));
}

/** Writes the bytes of whole rows, through `window` (an address with WINDOW bytes) or memory of its own where that is too small. */
export function writeRows(hdf5: Hdf5Build, slab: Slab, bytes: Uint8Array, window: number): void {
  const { module } = hdf5;
  const own = bytes.length > WINDOW ? module._malloc(bytes.length) : 0;
  const address = own === 0 ? window : own;
  const rest = slab.shape.slice(1).map(BigInt);
  const count = [BigInt(slab.rows), ...rest];
  const offset = [BigInt(slab.first), ...rest.map(() => 0n)];
  module.HEAPU8.set(bytes, address);
  module.set_dataset_data(
    slab.file,
    `/${slab.name}`,
    count,
    offset,
    count.map(() => 1n),
    BigInt(address),
  );
  if (own !== 0) module._free(own);
}

/** Text as fixed-length characters (what CF calls a char attribute), numbers as a row of their type. */
export function writeAttribute(target: AttributeTarget, name: string, value: AttributeValue): void {
  if (typeof value === 'string') {
    target.create_attribute(name, value, [], `S${new TextEncoder().encode(value).length}`);
  } else {
    target.create_attribute(name, [...value.values], [value.values.length], DTYPE[value.type]);
  }
}
