import { decompress } from 'fzstd';
import { type PageHeader, readHybrid, readPageHeader } from './parquet-pages.js';
import { unpackSnappy } from './snappy.js';

/** Physical types of numbers, and how many bytes each takes. */
const WIDTH = { INT32: 4, INT64: 8, FLOAT: 4, DOUBLE: 8 } as const;

export type ParquetNumber = keyof typeof WIDTH;

export function isParquetNumber(type: string): type is ParquetNumber {
  return Object.hasOwn(WIDTH, type);
}

export interface ParquetChunk {
  readonly type: ParquetNumber;
  /** Whole numbers without a sign. */
  readonly unsigned: boolean;
  readonly codec: string;
  /** Values may be missing: each page then says which are there. */
  readonly optional: boolean;
}

/** Encodings of parquet.thrift. */
const ENCODING = { plain: 0, plainDictionary: 2, rleDictionary: 8, byteStreamSplit: 9 } as const;

/** An encoding that this reader does not take; the caller gives it a code. */
export class UnknownEncoding extends Error {
  readonly encoding: number;
  constructor(encoding: number) {
    super(`encoding ${encoding}`);
    this.encoding = encoding;
  }
}

/**
 * Decodes one column of one row group, `bytes` being its pages one after another, into `into` (one entry a row, NaN
 * where a value is missing). Pages of either version; plain, dictionary and byte-stream-split encoding; no
 * compression, snappy or zstd. Every count is held against the bytes there are: a damaged file ends in a plain
 * error, never in a loop or in memory without bound.
 */
export function decodeParquetColumn(bytes: Uint8Array, chunk: ParquetChunk, into: Float64Array): void {
  let dictionary: Float64Array | null = null;
  let row = 0;
  for (let at = 0; row < into.length; ) {
    const header = readPageHeader(bytes, at);
    const end = header.end + header.packedBytes;
    if (end > bytes.length) throw new Error(`a page of ${header.packedBytes} bytes beyond the end`);
    const page = bytes.subarray(header.end, end);
    at = end;
    if (header.kind === 'dictionary') {
      const data = unpack(page, header.unpackedBytes, chunk.codec);
      dictionary = new Float64Array(fits(header.values, data.length, WIDTH[chunk.type]));
      readPlain(data, 0, chunk, dictionary, dictionary.length);
    } else if (header.kind !== 'other') {
      if (header.values > into.length - row) throw new Error(`${row + header.values} values instead of ${into.length}`);
      decodePage(page, header, chunk, dictionary, into.subarray(row, row + header.values));
      row += header.values;
    }
  }
}

function decodePage(
  page: Uint8Array,
  header: PageHeader,
  chunk: ParquetChunk,
  dictionary: Float64Array | null,
  into: Float64Array,
): void {
  let data: Uint8Array;
  let start = 0;
  let levels: Int32Array | null = null;
  if (header.kind === 'data-v2') {
    const levelBytes = header.repetitionBytes + header.definitionBytes;
    if (levelBytes > page.length || header.repetitionBytes > 0) throw new Error('levels beyond the page');
    if (chunk.optional) levels = readHybrid(page, 0, header.definitionBytes, 1, into.length);
    const values = page.subarray(levelBytes);
    data = header.packed ? unpack(values, header.unpackedBytes - levelBytes, chunk.codec) : values;
  } else {
    data = unpack(page, header.unpackedBytes, chunk.codec);
    if (chunk.optional) {
      const length = new DataView(data.buffer, data.byteOffset, data.length).getUint32(0, true);
      start = 4 + length;
      if (start > data.length) throw new Error('levels beyond the page');
      levels = readHybrid(data, 4, start, 1, into.length);
    }
  }
  let present = into.length;
  if (levels !== null) {
    present = 0;
    for (const level of levels) present += level;
  }
  readValues(data, start, header.encoding, chunk, dictionary, into, present);
  if (present === into.length || levels === null) return;
  // The values that are there stand at the front: spread them from the back.
  for (let i = into.length - 1, from = present - 1; i >= 0; i--) {
    into[i] = levels[i] === 1 ? into[from--] : Number.NaN;
  }
}

function readValues(
  data: Uint8Array,
  start: number,
  encoding: number,
  chunk: ParquetChunk,
  dictionary: Float64Array | null,
  into: Float64Array,
  count: number,
): void {
  if (count === 0) return;
  const width = WIDTH[chunk.type];
  if (encoding === ENCODING.plain) {
    fits(count, data.length - start, width);
    readPlain(data, start, chunk, into, count);
  } else if (encoding === ENCODING.plainDictionary || encoding === ENCODING.rleDictionary) {
    if (dictionary === null) throw new Error('a page without its dictionary');
    const indices = readHybrid(data, start + 1, data.length, data[start], count);
    for (let i = 0; i < count; i++) {
      if (indices[i] >= dictionary.length)
        throw new Error(`entry ${indices[i]} of a dictionary of ${dictionary.length}`);
      into[i] = dictionary[indices[i]];
    }
  } else if (encoding === ENCODING.byteStreamSplit) {
    fits(count, data.length - start, width);
    const joined = new Uint8Array(count * width);
    for (let i = 0; i < count; i++) for (let b = 0; b < width; b++) joined[i * width + b] = data[start + b * count + i];
    readPlain(joined, 0, chunk, into, count);
  } else throw new UnknownEncoding(encoding);
}

/** `count`, or an error when so many values need more bytes than there are. */
function fits(count: number, bytes: number, width: number): number {
  if (count * width > bytes) throw new Error(`${count} values in ${bytes} bytes`);
  return count;
}

function readPlain(data: Uint8Array, start: number, chunk: ParquetChunk, into: Float64Array, count: number): void {
  const view = new DataView(data.buffer, data.byteOffset, data.length);
  if (chunk.type === 'DOUBLE') for (let i = 0; i < count; i++) into[i] = view.getFloat64(start + 8 * i, true);
  else if (chunk.type === 'FLOAT') for (let i = 0; i < count; i++) into[i] = view.getFloat32(start + 4 * i, true);
  else if (chunk.type === 'INT32') {
    for (let i = 0; i < count; i++) {
      into[i] = chunk.unsigned ? view.getUint32(start + 4 * i, true) : view.getInt32(start + 4 * i, true);
    }
  } else {
    for (let i = 0; i < count; i++) {
      const high = chunk.unsigned ? view.getUint32(start + 8 * i + 4, true) : view.getInt32(start + 8 * i + 4, true);
      into[i] = high * 4294967296 + view.getUint32(start + 8 * i, true);
    }
  }
}

/** Largest page unpacked; writers aim at 1 MiB. */
const PAGE_LIMIT = 1 << 28;

function unpack(packed: Uint8Array, bytes: number, codec: string): Uint8Array {
  if (bytes > PAGE_LIMIT || bytes < 0) throw new Error(`a page of ${bytes} bytes`);
  if (codec === 'UNCOMPRESSED') {
    if (packed.length !== bytes) throw new Error(`${packed.length} bytes in a page of ${bytes}`);
    return packed;
  }
  const unpacked = new Uint8Array(bytes);
  if (codec === 'SNAPPY') unpackSnappy(packed, unpacked);
  else if (decompress(packed, unpacked).length !== bytes) throw new Error('a page of another length');
  return unpacked;
}
