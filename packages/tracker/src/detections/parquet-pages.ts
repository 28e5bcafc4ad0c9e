/** A page header of the Parquet format (parquet.thrift), as far as flat columns of numbers need it. */
export interface PageHeader {
  readonly kind: 'data' | 'data-v2' | 'dictionary' | 'other';
  readonly packedBytes: number;
  readonly unpackedBytes: number;
  readonly values: number;
  /** Number of the encoding in parquet.thrift. */
  readonly encoding: number;
  /** Only in data-v2: bytes of levels before the values, and whether the values are compressed. */
  readonly definitionBytes: number;
  readonly repetitionBytes: number;
  readonly packed: boolean;
  /** Where the page itself starts. */
  readonly end: number;
}

type Thrift = number | boolean | null | ReadonlyMap<number, Thrift>;

/**
 * Reads the page header at `at`. Every length is held against the bytes there are, so that a damaged file ends in an
 * error, never in a loop. Throws plain errors; the caller gives them a code.
 */
export function readPageHeader(bytes: Uint8Array, at: number): PageHeader {
  const cursor = { at };
  const header = readStruct(bytes, cursor, 0);
  const part = (field: number) => {
    const value = header.get(field);
    return value instanceof Map ? (value as ReadonlyMap<number, Thrift>) : null;
  };
  const number = (from: ReadonlyMap<number, Thrift> | null, field: number): number => {
    const value = from?.get(field);
    if (typeof value !== 'number' || value < 0) throw new Error(`a page header without field ${field}`);
    return value;
  };
  const kind = (['data', 'other', 'dictionary', 'data-v2'] as const)[number(header, 1)] ?? 'other';
  const v2 = kind === 'data-v2';
  const own = kind === 'data' ? part(5) : kind === 'dictionary' ? part(7) : v2 ? part(8) : null;
  return {
    kind,
    unpackedBytes: number(header, 2),
    packedBytes: number(header, 3),
    values: kind === 'other' ? 0 : number(own, 1),
    encoding: kind === 'other' ? 0 : number(own, v2 ? 4 : 2),
    definitionBytes: v2 ? number(own, 5) : 0,
    repetitionBytes: v2 ? number(own, 6) : 0,
    packed: !v2 || own?.get(7) !== false,
    end: cursor.at,
  };
}

/** Thrift's compact protocol: a struct as a map by field number; lists and texts are passed over. */
function readStruct(bytes: Uint8Array, cursor: { at: number }, depth: number): ReadonlyMap<number, Thrift> {
  if (depth > 8) throw new Error('a page header nested too deep');
  const fields = new Map<number, Thrift>();
  for (let field = 0; ; ) {
    const head = byteAt(bytes, cursor.at++);
    const type = head & 15;
    if (type === 0) return fields;
    field = head >> 4 === 0 ? zigzag(varint(bytes, cursor)) : field + (head >> 4);
    fields.set(field, readValue(bytes, cursor, type, depth));
  }
}

function readValue(bytes: Uint8Array, cursor: { at: number }, type: number, depth: number): Thrift {
  switch (type) {
    case 1:
      return true;
    case 2:
      return false;
    case 3:
      return byteAt(bytes, cursor.at++);
    case 4:
    case 5:
    case 6:
      return zigzag(varint(bytes, cursor));
    case 7:
      cursor.at += 8;
      return null;
    case 8: {
      cursor.at += varint(bytes, cursor);
      return null;
    }
    case 12:
      return readStruct(bytes, cursor, depth + 1);
    default:
      throw new Error(`a page header with a value of type ${type}`);
  }
}

/** Unsigned LEB128, at most 10 bytes; beyond 2^53 the last digits are lost, which no length survives anyway. */
function varint(bytes: Uint8Array, cursor: { at: number }): number {
  let value = 0;
  let unit = 1;
  for (let n = 0; n < 10; n++) {
    const byte = byteAt(bytes, cursor.at++);
    value += (byte & 127) * unit;
    if (byte < 128) return value;
    unit *= 128;
  }
  throw new Error('a number of more than 10 bytes');
}

function zigzag(value: number): number {
  return value % 2 === 0 ? value / 2 : -(value + 1) / 2;
}

function byteAt(bytes: Uint8Array, at: number): number {
  const byte = bytes[at];
  if (byte === undefined) throw new Error('an end within a page');
  return byte;
}

/**
 * Unpacks `count` whole numbers of `width` bits (0 to 24) from the hybrid of run lengths and bit packing, in
 * `bytes[start .. end - 1]`. Runs longer than what is asked for are cut, never written beyond.
 */
export function readHybrid(bytes: Uint8Array, start: number, end: number, width: number, count: number): Int32Array {
  const values = new Int32Array(count);
  if (width === 0) return values;
  if (width > 24) throw new Error(`${width} bits a value`);
  const part = bytes.subarray(0, end);
  const cursor = { at: start };
  let seen = 0;
  while (seen < count) {
    const head = varint(part, cursor);
    const run = Math.floor(head / 2);
    if (run === 0) throw new Error('a run of no values');
    if (head % 2 === 1) {
      const n = Math.min(8 * run, count - seen);
      let at = cursor.at;
      let bits = 0;
      let held = 0;
      const mask = (1 << width) - 1;
      for (let i = 0; i < n; i++) {
        while (held < width) {
          bits |= byteAt(part, at++) << held;
          held += 8;
        }
        values[seen + i] = bits & mask;
        bits >>>= width;
        held -= width;
      }
      seen += n;
      cursor.at += run * width;
    } else {
      let value = 0;
      for (let shift = 0; shift < width; shift += 8) value |= byteAt(part, cursor.at++) << shift;
      const n = Math.min(run, count - seen);
      values.fill(value, seen, seen + n);
      seen += n;
    }
  }
  return values;
}
