import type * as H5 from 'h5wasm';
import type { Hdf5Type } from '../core/hdf5.js';
import type { Hdf5Build } from '../core/result-place.js';
import { type AttributeValue, TYPE_SIZE } from './digest.js';

const DTYPE: Readonly<Record<Hdf5Type, string>> = { f32: '<f', f64: '<d', u8: '<B', u16: '<H', i32: '<i', i64: '<q' };

/** What an attribute can be given to: a dataset or the file. */
export type AttributeTarget = Pick<H5.Dataset, 'create_attribute'>;

/** Rows of a chunk that is never written; any number serves. */
const CHUNK_ROWS = 4096;

/**
 * A dataset of this shape without values and without room for them: a dimension's scale, or a variable that has none.
 * Attribute order tracked. Grown from zero rows, since the build makes any other only with values.
 */
export function createEmpty(
  hdf5: Hdf5Build,
  file: bigint,
  name: string,
  type: Hdf5Type,
  shape: readonly number[],
): void {
  const sizes = {
    shape: shape.map((size, index) => (index === 0 ? 0n : BigInt(size))),
    maxshape: shape.map((size) => BigInt(Math.max(size, 1))),
    chunks: shape.map((size, index) => BigInt(Math.max(1, index === 0 ? Math.min(CHUNK_ROWS, size) : size))),
  };
  create(hdf5, file, name, type, sizes, 0);
  hdf5.module.resize_dataset(file, `/${name}`, shape.map(BigInt));
}

/**
 * A contiguous dataset of one value, in as many dimensions as `rank`, whose bytes tell `index`: to be given its shape and
 * place by `placeValues`. Little-endian, uncompressed, attribute order tracked. At most 256 of them are told apart where
 * a type has one byte.
 */
export function createPlaceholder(
  hdf5: Hdf5Build,
  file: bigint,
  name: string,
  type: Hdf5Type,
  rank: number,
  index: number,
): void {
  const ones = Array.from({ length: rank }, () => 1n);
  create(hdf5, file, name, type, { shape: ones, maxshape: ones, chunks: null }, index);
}

interface Sizes {
  readonly shape: bigint[];
  readonly maxshape: bigint[];
  readonly chunks: bigint[] | null;
}

function create(hdf5: Hdf5Build, file: bigint, name: string, type: Hdf5Type, sizes: Sizes, value: number): void {
  const { module } = hdf5;
  const float = type === 'f32' || type === 'f64';
  const metadata = {
    ...sizes,
    type: float ? 1 : 0,
    size: TYPE_SIZE[type],
    signed: type === 'i32' || type === 'i64',
    vlen: false,
    littleEndian: true,
    total_size: sizes.chunks === null ? 1 : 0,
    compression: 0,
    compression_opts: [],
    track_order: true,
  };
  // An address is needed although no row may be written yet.
  const address = module._malloc(8);
  module.HEAPU8.fill(0, address, address + 8);
  for (let i = 0; i < 4; i++) module.HEAPU8[address + i] = (value >>> (8 * i)) & 0xff;
  module.create_dataset(file, `/${name}`, BigInt(address), metadata);
  module._free(address);
}

/** Text as fixed-length characters (what CF calls a char attribute), numbers as a row of their type. */
export function writeAttribute(target: AttributeTarget, name: string, value: AttributeValue): void {
  if (typeof value === 'string') {
    target.create_attribute(name, value, [], `S${new TextEncoder().encode(value).length}`);
  } else {
    target.create_attribute(name, [...value.values], [value.values.length], DTYPE[value.type]);
  }
}
