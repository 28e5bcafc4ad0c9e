import type { Hasher, HasherFactory } from '../core/bytes.js';
import type { Hdf5Type } from '../core/hdf5.js';

/**
 * Content digest of a NetCDF file: what is in it, whatever the layout of its bytes (HDF5 notes creation times).
 *
 * Recipe, byte for byte. Every line is UTF-8 and ends with LF; HASH is SHA-256 in lower-case hex.
 * - A variable: `variable NAME TYPE SHAPE DIMENSIONS HASH`, SHAPE the sizes and DIMENSIONS the dimension names
 *   joined by `,` (both `-` for none), HASH over its values in row order, last dimension fastest, little-endian,
 *   in the type of the file.
 * - A dimension without values: `dimension NAME SIZE`.
 * - An attribute: `attribute OWNER NAME TYPE COUNT HASH`, OWNER the variable or `/` for the file; TYPE `text` with
 *   HASH over its UTF-8 bytes and COUNT their number, or a numeric type with HASH over its little-endian values.
 *   Attributes that only tell HDF5 and NetCDF how datasets hang together (`BOOKKEEPING`) are left out.
 * - The lines sorted by UTF-16 code unit and joined; the file's digest is HASH over that.
 * - The digest of a folder: lines `FILE DIGEST`, sorted, joined, hashed.
 * NaN has one form in results (`canonicalNaN`), so equal results have equal digests.
 */
export interface DigestLedger {
  /** Starts a variable; feed it the bytes of its values in order, then call `end`. */
  variable(name: string, type: Hdf5Type, shape: readonly number[], dimensions: readonly string[]): VariableDigest;
  dimension(name: string, size: number): void;
  attribute(owner: string, name: string, value: AttributeValue): void;
  /** Hex digest of everything entered; every variable must have ended. */
  hex(): string;
}

export interface VariableDigest {
  update(bytes: Uint8Array): void;
  end(): void;
}

/** Text, or numbers of one type (integers in the type of the variable they belong to). */
export type AttributeValue = string | { readonly type: Hdf5Type; readonly values: readonly number[] };

/** Attributes of HDF5 dimension scales and of the NetCDF-4 library: bookkeeping, no content. */
export const BOOKKEEPING: ReadonlySet<string> = new Set([
  'CLASS',
  'NAME',
  'REFERENCE_LIST',
  'DIMENSION_LIST',
  'DIMENSION_LABELS',
  '_Netcdf4Dimid',
  '_Netcdf4Coordinates',
  '_NCProperties',
  '_nc3_strict',
]);

function hashOf(hasher: HasherFactory, bytes: Uint8Array): string {
  const one = hasher();
  one.update(bytes);
  return one.hex();
}

/** Hex digest over sorted lines, each ended by LF. */
function hashOfLines(hasher: HasherFactory, lines: readonly string[]): string {
  const sorted = [...lines].sort((a, b) => (a < b ? -1 : a > b ? 1 : 0));
  return hashOf(hasher, new TextEncoder().encode(sorted.map((line) => `${line}\n`).join('')));
}

/** Little-endian bytes of numbers in the given type. `i64`: whole numbers of at most 2^53. */
export function numberBytes(type: Hdf5Type, values: ArrayLike<number>): Uint8Array {
  const size = TYPE_SIZE[type];
  const bytes = new Uint8Array(values.length * size);
  const view = new DataView(bytes.buffer);
  for (let i = 0; i < values.length; i++) {
    const value = values[i];
    if (type === 'f64') view.setFloat64(8 * i, value, true);
    else if (type === 'f32') view.setFloat32(4 * i, value, true);
    else if (type === 'i32') view.setInt32(4 * i, value, true);
    else if (type === 'u16') view.setUint16(2 * i, value, true);
    else if (type === 'u8') view.setUint8(i, value);
    else view.setBigInt64(8 * i, BigInt(value), true);
  }
  return bytes;
}

/** Bytes of one value. */
export const TYPE_SIZE: Readonly<Record<Hdf5Type, number>> = { f32: 4, f64: 8, u8: 1, u16: 2, i32: 4, i64: 8 };

/** An empty ledger. */
export function openLedger(hasher: HasherFactory): DigestLedger {
  const lines: string[] = [];
  let running = 0;
  return {
    variable(name, type, shape, dimensions) {
      const hash: Hasher = hasher();
      running++;
      return {
        update: (bytes) => hash.update(bytes),
        end() {
          running--;
          lines.push(`variable ${name} ${type} ${shape.join() || '-'} ${dimensions.join() || '-'} ${hash.hex()}`);
        },
      };
    },
    dimension: (name, size) => void lines.push(`dimension ${name} ${size}`),
    attribute(owner, name, value) {
      const text = typeof value === 'string';
      const bytes = text ? new TextEncoder().encode(value) : numberBytes(value.type, value.values);
      const count = text ? bytes.length : value.values.length;
      lines.push(`attribute ${owner} ${name} ${text ? 'text' : value.type} ${count} ${hashOf(hasher, bytes)}`);
    },
    hex() {
      if (running !== 0) throw new Error(`digest: ${running} variables have not ended`);
      return hashOfLines(hasher, lines);
    },
  };
}

/** Digest of several files from the digest of each, whatever their order. */
export function folderDigest(hasher: HasherFactory, files: Readonly<Record<string, string>>): string {
  return hashOfLines(
    hasher,
    Object.entries(files).map(([file, digest]) => `${file} ${digest}`),
  );
}
