import { WakeloomError } from '../core/errors.js';

/** One column of a NPY array: how to read its values out of a record. */
export interface NpyColumn {
  readonly name: string | null;
  /** Kind and size as NumPy writes them: f4, f8, i1 .. i8, u1 .. u8, b1. */
  readonly type: string;
  readonly littleEndian: boolean;
  /** Bytes from the start of the record (array in rows), or from the start of the data (array in columns). */
  readonly offset: number;
}

export interface NpyHeader {
  readonly rows: number;
  readonly columns: readonly NpyColumn[];
  /** False for a plain array, whose columns have no names. */
  readonly named: boolean;
  /** Bytes from one row to the next within a column. */
  readonly stride: number;
  /** True when each column lies by itself (Fortran order). */
  readonly byColumn: boolean;
  readonly dataStart: number;
  readonly dataBytes: number;
}

type Literal = string | number | boolean | null | Literal[] | { [key: string]: Literal };

/**
 * Reads the header of a NPY file, versions 1 to 3 (NumPy Enhancement Proposal 1): a two-dimensional array of numbers,
 * rows by columns, or a one-dimensional array of records. `bytes` holds the header whole.
 *
 * Throws `dump/corrupt-npy`, `dump/npy-kind`.
 */
export function parseNpyHeader(bytes: Uint8Array, file: string): NpyHeader {
  const { start, length } = npyHeaderExtent(bytes, file);
  const text = new TextDecoder('latin1').decode(bytes.subarray(start, start + length));
  const header = parseLiteral(text, file);
  if (header === null || typeof header !== 'object' || Array.isArray(header)) throw corrupt('no dictionary', file);
  const shape = header['shape'];
  if (!Array.isArray(shape) || !shape.every((n): n is number => Number.isSafeInteger(n) && (n as number) >= 0)) {
    throw corrupt('no shape', file);
  }
  const byColumn = header['fortran_order'] === true;
  const descr = header['descr'];
  const dataStart = start + length;
  if (typeof descr === 'string') {
    if (shape.length !== 2) throw kind(`an array of ${shape.length} dimensions`, file);
    const [rows, count] = shape;
    if (count > 4096) throw kind(`${count} columns`, file);
    const { type, littleEndian, size } = scalar(descr, file);
    const columns = Array.from({ length: count }, (_, at) => ({
      name: null,
      type,
      littleEndian,
      offset: byColumn ? at * rows * size : at * size,
    }));
    const stride = byColumn ? size : count * size;
    return { rows, columns, named: false, stride, byColumn, dataStart, dataBytes: rows * count * size };
  }
  if (!Array.isArray(descr)) throw corrupt('no type', file);
  if (shape.length !== 1) throw kind(`records in ${shape.length} dimensions`, file);
  const columns: NpyColumn[] = [];
  let offset = 0;
  for (const field of descr) {
    if (!Array.isArray(field) || field.length < 2) throw corrupt('a field without a type', file);
    const [name, type, inner] = field;
    if (typeof type !== 'string') throw kind('records within records', file);
    const repeat = Array.isArray(inner) ? inner.reduce<number>((n, m) => n * Number(m), 1) : 1;
    // Text and opaque fields are passed over: only their width counts.
    const opaque = /^\|?[<>=]?[SUV](\d+)$/.exec(type);
    if (opaque !== null) offset += Number(opaque[1]) * (type.includes('U') ? 4 : 1) * repeat;
    else {
      const parsed = scalar(type, file);
      const title = Array.isArray(name) ? name[1] : name;
      const usable = repeat === 1 && typeof title === 'string' && title !== '';
      if (usable) columns.push({ name: title, type: parsed.type, littleEndian: parsed.littleEndian, offset });
      offset += parsed.size * repeat;
    }
  }
  if (!Number.isSafeInteger(offset) || offset <= 0 || offset > 1 << 20) throw corrupt('a record without a size', file);
  const named = true;
  return { rows: shape[0], columns, named, stride: offset, byColumn: false, dataStart, dataBytes: shape[0] * offset };
}

/** Where the header text lies; `bytes` holds at least the first 12 bytes. Throws `dump/corrupt-npy`. */
export function npyHeaderExtent(bytes: Uint8Array, file: string): { start: number; length: number } {
  if (bytes.length < 12) throw corrupt('fewer than 12 bytes', file);
  const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
  const version = bytes[6];
  if (version < 1 || version > 3) throw corrupt(`version ${version}`, file);
  return version === 1
    ? { start: 10, length: view.getUint16(8, true) }
    : { start: 12, length: view.getUint32(8, true) };
}

function scalar(descr: string, file: string): { type: string; littleEndian: boolean; size: number } {
  const match = /^([<>|=])?([fiub])([1248])$/.exec(descr);
  const known = match !== null && !['f1', 'f2', 'b2', 'b4', 'b8'].includes(match[2] + match[3]);
  if (match === null || !known) throw kind(`values of type ${descr}`, file);
  return { type: match[2] + match[3], littleEndian: match[1] !== '>', size: Number(match[3]) };
}

/** Python's literals as far as NPY headers use them. */
function parseLiteral(text: string, file: string): Literal {
  let at = 0;
  const skip = () => {
    while (at < text.length && /\s/.test(text[at])) at++;
  };
  const sequence = (close: string, depth: number): Literal[] => {
    const items: Literal[] = [];
    at++;
    for (skip(); text[at] !== close; skip()) {
      items.push(value(depth + 1));
      skip();
      if (text[at] === ',') at++;
      else if (text[at] !== close) throw corrupt('a list that does not close', file);
    }
    at++;
    return items;
  };
  const value = (depth: number): Literal => {
    skip();
    if (depth > 16) throw corrupt('nesting', file);
    const byte = text[at];
    if (byte === '(') return sequence(')', depth);
    if (byte === '[') return sequence(']', depth);
    if (byte === '{') {
      const result: { [key: string]: Literal } = Object.create(null);
      at++;
      for (skip(); text[at] !== '}'; skip()) {
        const key = value(depth + 1);
        skip();
        if (typeof key !== 'string' || text[at] !== ':') throw corrupt('a dictionary without keys', file);
        at++;
        result[key] = value(depth + 1);
        skip();
        if (text[at] === ',') at++;
        else if (text[at] !== '}') throw corrupt('a dictionary that does not close', file);
      }
      at++;
      return result;
    }
    if (byte === "'" || byte === '"') {
      const close = text.indexOf(byte, at + 1);
      if (close < 0) throw corrupt('a text that does not close', file);
      const word = text.slice(at + 1, close);
      at = close + 1;
      return word;
    }
    const word = /^(True|False|None|\d+L?)/.exec(text.slice(at, at + 24))?.[0];
    if (word === undefined) throw corrupt(`"${text.slice(at, at + 10)}"`, file);
    at += word.length;
    return word === 'True' ? true : word === 'False' ? false : word === 'None' ? null : Number.parseInt(word, 10);
  };
  return value(0);
}

function corrupt(got: string, file: string): WakeloomError {
  return new WakeloomError(
    'dump/corrupt-npy',
    `NPY header: got ${got}, expected a header as NumPy writes it, version 1 to 3 (${file})`,
    { file },
  );
}

function kind(got: string, file: string): WakeloomError {
  return new WakeloomError(
    'dump/npy-kind',
    `NPY array: got ${got}, expected two dimensions (rows, columns) of real or whole numbers, or records of such (${file})`,
    { file },
  );
}
