import type { ByteSource } from '../core/bytes.js';
import { WakeloomError } from '../core/errors.js';
import { readFrom, readHead } from './byte-stream.js';
import { planColumns } from './column-plan.js';
import type { DumpPass } from './dump-pass.js';
import { type NpyColumn, npyHeaderExtent, parseNpyHeader } from './npy-header.js';
import { BATCH_ROWS } from './row-batch.js';

/** Longest header read: NumPy's own limit on what it evaluates is 10 000 bytes. */
const HEADER_LIMIT = 1 << 20;

/** Bytes of records read at a time. */
const PIECE = 1 << 20;

/**
 * Reads a NPY file: a 2-D array whose columns go by position, or records whose columns go by name; either byte
 * order, rows or columns first. Whole numbers of 64 bits beyond 2^53 lose their last digits. Yields whenever
 * `pass.batch` holds rows. Memory: one piece.
 *
 * Throws `dump/corrupt-npy`, `dump/npy-kind`, `dump/truncated-npy`.
 */
export async function* readNpy(source: ByteSource, pass: DumpPass): AsyncGenerator<void> {
  const file = source.name;
  const { start, length } = npyHeaderExtent(await readHead(source, 12), file);
  const header = parseNpyHeader(await readHead(source, Math.min(start + length, HEADER_LIMIT)), file);
  const has = source.size - header.dataStart;
  if (has !== header.dataBytes) {
    const short = has < header.dataBytes;
    throw new WakeloomError(
      short ? 'dump/truncated-npy' : 'dump/corrupt-npy',
      `NPY file ${short ? 'cut short' : 'too long'}: got ${has} bytes of data, expected ${header.dataBytes} for ${header.rows} rows; copy the file again (${file})`,
      { file, bytes: has, expected: header.dataBytes },
    );
  }
  const names = header.named ? header.columns.map((column) => column.name ?? '') : null;
  const first = header.columns[0];
  const plan = planColumns(
    {
      file,
      names,
      count: header.columns.length,
      firstIsWhole: first !== undefined && (await columnIsWhole(source, header.dataStart, header, first)),
      needsFrame: pass.settings.layout === 'one-file-a-run',
      timesAreClock: pass.settings.timesAreClock,
    },
    pass.settings.columns,
  );
  pass.agreeColumns(file, plan);
  const { batch, ledger } = pass;
  const wanted = [...plan.index].flatMap((at, role) => (at < 0 ? [] : [{ role, column: header.columns[at] }]));
  const chunk = Math.max(1, Math.min(BATCH_ROWS, Math.floor(PIECE / header.stride)));
  const piece = new Uint8Array(chunk * header.stride);
  const view = new DataView(piece.buffer);
  for (let row = 0; row < header.rows; row += chunk) {
    const rows = Math.min(chunk, header.rows - row);
    const bytes = piece.subarray(0, rows * header.stride);
    const at = header.dataStart + row * header.stride;
    if (!header.byColumn) await fill(source, at, bytes);
    for (const { role, column } of wanted) {
      if (header.byColumn) await fill(source, at + column.offset, bytes);
      decode(view, header.byColumn ? 0 : column.offset, header.stride, rows, column, batch.columns[role]);
    }
    for (let i = 0; i < rows; i++) batch.row[i] = ledger.rowsPresent++;
    batch.line.fill(0, 0, rows);
    batch.rows = rows;
    pass.advance(Math.round((rows / header.rows) * source.size));
    yield;
    await pass.context.breathe();
  }
}

/** Whether the first column of an array without names looks like frame numbers, told from its first rows. */
async function columnIsWhole(
  source: ByteSource,
  dataStart: number,
  header: { rows: number; stride: number; byColumn: boolean },
  column: NpyColumn,
): Promise<boolean> {
  const rows = Math.min(header.rows, 400, Math.floor(PIECE / header.stride));
  const bytes = new Uint8Array(rows * header.stride);
  await fill(source, dataStart + (header.byColumn ? column.offset : 0), bytes);
  const values = new Float64Array(rows);
  const offset = header.byColumn ? 0 : column.offset;
  decode(new DataView(bytes.buffer), offset, header.stride, rows, column, values);
  return values.every((value) => Number.isInteger(value) || !Number.isFinite(value));
}

async function fill(source: ByteSource, position: number, into: Uint8Array): Promise<void> {
  if ((await readFrom(source, position, into)) === into.length) return;
  throw new WakeloomError(
    'dump/truncated-npy',
    `NPY file cut short: got an end before byte ${position + into.length}, expected ${source.size} bytes (${source.name})`,
    { file: source.name },
  );
}

function decode(
  view: DataView,
  offset: number,
  stride: number,
  rows: number,
  column: NpyColumn,
  into: Float64Array,
): void {
  const little = column.littleEndian;
  let at = offset;
  switch (column.type) {
    case 'f8':
      for (let i = 0; i < rows; i++, at += stride) into[i] = view.getFloat64(at, little);
      return;
    case 'f4':
      for (let i = 0; i < rows; i++, at += stride) into[i] = view.getFloat32(at, little);
      return;
    case 'i8':
      for (let i = 0; i < rows; i++, at += stride) into[i] = Number(view.getBigInt64(at, little));
      return;
    case 'u8':
      for (let i = 0; i < rows; i++, at += stride) into[i] = Number(view.getBigUint64(at, little));
      return;
    case 'i4':
      for (let i = 0; i < rows; i++, at += stride) into[i] = view.getInt32(at, little);
      return;
    case 'u4':
      for (let i = 0; i < rows; i++, at += stride) into[i] = view.getUint32(at, little);
      return;
    case 'i2':
      for (let i = 0; i < rows; i++, at += stride) into[i] = view.getInt16(at, little);
      return;
    case 'u2':
      for (let i = 0; i < rows; i++, at += stride) into[i] = view.getUint16(at, little);
      return;
    case 'i1':
      for (let i = 0; i < rows; i++, at += stride) into[i] = view.getInt8(at);
      return;
    default:
      for (let i = 0; i < rows; i++, at += stride) into[i] = view.getUint8(at);
  }
}
