import type { Hdf5Type, NumericArray } from '../core/hdf5.js';

/**
 * Little-endian bytes of `values` in the type of the file, with every NaN in its one form (0x7fc00000 and
 * 0x7ff8000000000000), so that equal results are equal bytes. Where the array already has the type, NaNs are
 * rewritten in place and the bytes are a view (borrowed); otherwise they are new. `i64` takes whole numbers in a
 * Float64Array, from -2^53 to 2^53. Every platform that runs JavaScript engines today is little-endian.
 */
export function canonicalBytes(values: NumericArray, type: Hdf5Type): Uint8Array {
  if (type === 'i64') return integerBytes(values);
  const array = sameType(values, type);
  if (array instanceof Float32Array) canonicalNaN32(array);
  else if (array instanceof Float64Array) canonicalNaN64(array);
  return new Uint8Array(array.buffer, array.byteOffset, array.byteLength);
}

function sameType(values: NumericArray, type: Exclude<Hdf5Type, 'i64'>): NumericArray {
  if (type === 'f32') return values instanceof Float32Array ? values : Float32Array.from(values);
  if (type === 'f64') return values instanceof Float64Array ? values : Float64Array.from(values);
  if (type === 'i32') return values instanceof Int32Array ? values : Int32Array.from(values);
  if (type === 'u16') return values instanceof Uint16Array ? values : Uint16Array.from(values);
  return values instanceof Uint8Array ? values : Uint8Array.from(values);
}

function canonicalNaN32(values: Float32Array): void {
  const bits = new Uint32Array(values.buffer, values.byteOffset, values.length);
  for (let i = 0; i < bits.length; i++) if ((bits[i] & 0x7fffffff) > 0x7f800000) bits[i] = 0x7fc00000;
}

function canonicalNaN64(values: Float64Array): void {
  const words = new Uint32Array(values.buffer, values.byteOffset, 2 * values.length);
  for (let i = 0; i < values.length; i++) {
    if (!Number.isNaN(values[i])) continue;
    words[2 * i] = 0;
    words[2 * i + 1] = 0x7ff80000;
  }
}

/** Two 32-bit words a number: building a BigInt for each would cost ten times as much. */
function integerBytes(values: NumericArray): Uint8Array {
  const words = new Uint32Array(2 * values.length);
  for (let i = 0; i < values.length; i++) {
    const value = values[i];
    const low = value >>> 0;
    words[2 * i] = low;
    words[2 * i + 1] = (value - low) / 4294967296;
  }
  return new Uint8Array(words.buffer);
}

/** Whole numbers out of 64-bit integers, exact up to 2^53 in size. */
export function integersFromBytes(bytes: Uint8Array): Float64Array {
  const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
  const values = new Float64Array(bytes.byteLength / 8);
  for (let i = 0; i < values.length; i++) {
    values[i] = view.getInt32(8 * i + 4, true) * 4294967296 + view.getUint32(8 * i, true);
  }
  return values;
}
