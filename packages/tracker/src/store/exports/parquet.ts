import { ByteWriter, type ColumnSource, ParquetWriter } from 'hyparquet-writer';
import type { NumericArray } from '../../core/hdf5.js';
import { type CountedSink, type ExportSettings, type ExportTable, type ExportType, pieces } from './table.js';

const PHYSICAL: Readonly<Record<ExportType, 'INT32' | 'INT64' | 'FLOAT' | 'DOUBLE'>> = {
  i32: 'INT32',
  i64: 'INT64',
  f32: 'FLOAT',
  f64: 'DOUBLE',
};

/** Rows of a row group: large enough for readers, small enough to hold in memory with all columns. */
const GROUP_ROWS = 65536;

function typed(values: NumericArray, type: ExportType): ColumnSource['data'] {
  if (type === 'i64') return BigInt64Array.from(values, (value) => BigInt(value));
  if (type === 'i32') return values instanceof Int32Array ? values : Int32Array.from(values);
  if (type === 'f32') return values instanceof Float32Array ? values : Float32Array.from(values);
  return values instanceof Float64Array ? values : Float64Array.from(values);
}

/**
 * Apache Parquet, one row group at a time, Snappy-compressed, every column required; units stand in the key-value
 * metadata under `units` as JSON. NaN where there is no figure. Memory: one row group.
 */
export async function writeParquet(table: ExportTable, sink: CountedSink, settings: ExportSettings): Promise<void> {
  const buffer = new ByteWriter();
  // The writer counts file positions in `offset` itself; only its buffer is emptied here.
  const drain = async () => {
    const bytes = buffer.getBytes().slice();
    buffer.index = 0;
    await sink.write(bytes);
  };
  const units = JSON.stringify(Object.fromEntries(table.columns.map((column) => [column.name, column.unit])));
  const writer = new ParquetWriter({
    writer: buffer,
    schema: [
      { name: 'root', num_children: table.columns.length },
      ...table.columns.map(({ name, type }) => ({ name, type: PHYSICAL[type], repetition_type: 'REQUIRED' as const })),
    ],
    kvMetadata: [{ key: 'units', value: units }],
    createdBy: 'wakeloom',
  });
  for await (const { start, end, values } of pieces(table, { ...settings, rows: settings.rows ?? GROUP_ROWS })) {
    const columnData = table.columns.map(({ name, type }, c) => ({ name, data: typed(values[c]!, type) }));
    await writer.write({ columnData, rowGroupSize: end - start });
    await drain();
  }
  await writer.finish();
  await drain();
}
