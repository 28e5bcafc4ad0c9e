import { type CountedSink, type ExportSettings, type ExportTable, type ExportType, pieces } from './table.js';

const DESCR: Readonly<Record<ExportType, string>> = { i32: '<i4', i64: '<i8', f32: '<f4', f64: '<f8' };
const SIZE: Readonly<Record<ExportType, number>> = { i32: 4, i64: 8, f32: 4, f64: 8 };

/** Header of NPY format version 1.0, padded with blanks to a multiple of 64 bytes as the format asks. */
function header(table: ExportTable): Uint8Array {
  const fields = table.columns.map((column) => `('${column.name}', '${DESCR[column.type]}')`).join(', ');
  const shape = table.shape.length === 1 ? `${table.shape[0]},` : table.shape.join(', ');
  const text = `{'descr': [${fields}], 'fortran_order': False, 'shape': (${shape}), }`;
  const length = Math.ceil((10 + text.length + 1) / 64) * 64;
  const bytes = new Uint8Array(length).fill(0x20);
  bytes.set([0x93, 0x4e, 0x55, 0x4d, 0x50, 0x59, 1, 0, (length - 10) & 0xff, (length - 10) >> 8]);
  bytes.set(new TextEncoder().encode(text), 10);
  bytes[length - 1] = 0x0a;
  return bytes;
}

/**
 * One NPY file (NumPy enhancement proposal 1, version 1.0) that holds a structured array: a named field a column,
 * little-endian, rows one after another; a grid has the shape (ny, nx) or (nz, ny, nx). NaN where there is no figure.
 */
export async function writeNpy(table: ExportTable, sink: CountedSink, settings: ExportSettings): Promise<void> {
  await sink.write(header(table));
  const rowBytes = table.columns.reduce((sum, column) => sum + SIZE[column.type], 0);
  for await (const { start, end, values } of pieces(table, settings)) {
    const bytes = new Uint8Array((end - start) * rowBytes);
    const view = new DataView(bytes.buffer);
    let offset = 0;
    table.columns.forEach(({ type }, c) => {
      const column = values[c]!;
      for (let row = 0; row < end - start; row++) {
        const at = row * rowBytes + offset;
        if (type === 'i32') view.setInt32(at, column[row]!, true);
        else if (type === 'i64') view.setBigInt64(at, BigInt(column[row]!), true);
        else if (type === 'f32') view.setFloat32(at, column[row]!, true);
        else view.setFloat64(at, column[row]!, true);
      }
      offset += SIZE[type];
    });
    await sink.write(bytes);
  }
}
