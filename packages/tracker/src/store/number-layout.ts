import type { NumericArray } from '../core/hdf5.js';

/** How one number of a dataset or of a table's member lies in its bytes. */
export interface NumberLayout {
  readonly kind: 'float' | 'signed' | 'unsigned';
  readonly size: 1 | 2 | 4 | 8;
  readonly littleEndian: boolean;
}

/** The layout, null for what is no number we read (text, references, half floats, arrays). HDF5 classes: 0 integer, 1 float. */
export function numberLayout(metadata: {
  type: number;
  size: number;
  signed: boolean;
  littleEndian: boolean;
}): NumberLayout | null {
  const { type, size, littleEndian } = metadata;
  if (size !== 1 && size !== 2 && size !== 4 && size !== 8) return null;
  if (type === 1) return size >= 4 ? { kind: 'float', size, littleEndian } : null;
  return type === 0 ? { kind: metadata.signed ? 'signed' : 'unsigned', size, littleEndian } : null;
}

/**
 * `count` numbers, the first at `offset`, one every `stride` bytes, as a new array of the smallest of our types that
 * holds them; 64-bit integers as Float64 (exact up to 2^53).
 */
export function decodeNumbers(
  bytes: Uint8Array,
  layout: NumberLayout & { readonly offset?: number; readonly stride?: number },
  count: number,
): NumericArray {
  const { offset = 0, stride = layout.size, littleEndian } = layout;
  const out = emptyArray(layout, count);
  if (littleEndian && stride === layout.size && !(layout.kind !== 'float' && layout.size === 8)) {
    new Uint8Array(out.buffer).set(bytes.subarray(offset, offset + count * stride));
    return out;
  }
  const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
  const read = reader(view, layout);
  for (let i = 0; i < count; i++) out[i] = read(offset + i * stride);
  return out;
}

function emptyArray({ kind, size }: NumberLayout, count: number): NumericArray {
  if (size === 8) return new Float64Array(count);
  if (kind === 'float') return new Float32Array(count);
  if (kind === 'signed')
    return size === 1 ? new Int8Array(count) : size === 2 ? new Int16Array(count) : new Int32Array(count);
  return size === 1 ? new Uint8Array(count) : size === 2 ? new Uint16Array(count) : new Uint32Array(count);
}

function reader(view: DataView, { kind, size, littleEndian }: NumberLayout): (at: number) => number {
  if (kind === 'float') {
    return size === 4 ? (at) => view.getFloat32(at, littleEndian) : (at) => view.getFloat64(at, littleEndian);
  }
  const high = littleEndian ? 4 : 0;
  if (kind === 'signed') {
    if (size === 1) return (at) => view.getInt8(at);
    if (size === 2) return (at) => view.getInt16(at, littleEndian);
    if (size === 4) return (at) => view.getInt32(at, littleEndian);
    return (at) => view.getInt32(at + high, littleEndian) * 4294967296 + view.getUint32(at + 4 - high, littleEndian);
  }
  if (size === 1) return (at) => view.getUint8(at);
  if (size === 2) return (at) => view.getUint16(at, littleEndian);
  if (size === 4) return (at) => view.getUint32(at, littleEndian);
  return (at) => view.getUint32(at + high, littleEndian) * 4294967296 + view.getUint32(at + 4 - high, littleEndian);
}
