import { parquetWriteBuffer } from 'hyparquet-writer';
import { expect, it } from 'vitest';
import { flatRows, memorySource, readDump } from '../helpers/dump-sources.js';

type Columns = Parameters<typeof parquetWriteBuffer>[0]['columnData'];

function parquet(columnData: Columns, options: Partial<Parameters<typeof parquetWriteBuffer>[0]> = {}): Uint8Array {
  return new Uint8Array(parquetWriteBuffer({ columnData, ...options }));
}

const ROWS = 2500;
const column = (value: (i: number) => number) => Array.from({ length: ROWS }, (_, i) => value(i));
const TABLE: Columns = [
  { name: 'frame', data: column((i) => i >> 4), type: 'INT32' },
  { name: 'note', data: Array.from({ length: ROWS }, () => 'text'), type: 'STRING' },
  { name: 'x', data: column((i) => i + 0.25), type: 'DOUBLE' },
  { name: 'y', data: column((i) => (i * 31) % 977), type: 'FLOAT' },
  { name: 'track', data: Array.from({ length: ROWS }, (_, i) => BigInt(i % 9)), type: 'INT64' },
];
const whole = (row: number[], i: number) =>
  row[0] === i >> 4 && row[1] === i + 0.25 && row[2] === (i * 31) % 977 && row[6] === i % 9;

it('reads columns by name, one row group or many, compressed or not', async () => {
  for (const options of [{}, { rowGroupSize: 700 }, { rowGroupSize: [1, 999] }, { codec: 'UNCOMPRESSED' as const }]) {
    const { scan, blocks } = await readDump([memorySource('run.parquet', parquet(TABLE, options))]);
    expect(scan).toMatchObject({ format: 'parquet', dims: 2, rowsPresent: ROWS, rowsRead: ROWS });
    expect(flatRows(blocks).every(whole)).toBe(true);
  }
});

it('reads dictionary and byte-stream-split pages, and refuses an encoding it does not know by a code', async () => {
  const encoded = (
    encoding: 'PLAIN' | 'RLE_DICTIONARY' | 'BYTE_STREAM_SPLIT' | 'DELTA_BINARY_PACKED',
    at: readonly number[],
  ) => parquet(TABLE.map((c, i) => (at.includes(i) ? { ...c, encoding } : c)));
  for (const bytes of [
    encoded('RLE_DICTIONARY', [0, 4]),
    encoded('BYTE_STREAM_SPLIT', [2, 3]),
    encoded('PLAIN', [0, 2, 3, 4]),
  ]) {
    expect(flatRows((await readDump([memorySource('run.parquet', bytes)])).blocks).every(whole)).toBe(true);
  }
  await expect(readDump([memorySource('run.parquet', encoded('DELTA_BINARY_PACKED', [0]))])).rejects.toMatchObject({
    code: 'dump/parquet-encoding',
    message: expect.stringContaining('"frame"'),
  });
});

it('takes a missing value for NaN', async () => {
  const bytes = parquet([
    { name: 'frame', data: [0, 0, 1], type: 'INT32' },
    { name: 'x', data: [1, null, 3], type: 'DOUBLE', nullable: true },
    { name: 'y', data: [1, 2, 3], type: 'DOUBLE' },
  ]);
  const { scan } = await readDump([memorySource('run.parquet', bytes)]);
  expect(scan.rowsRead).toBe(2);
  expect(scan.setAside).toMatchObject([{ reason: 'not-finite', count: 1 }]);
});

it('refuses text columns, missing columns, unknown compression and damaged files', async () => {
  const read = (bytes: Uint8Array, columns = {}) => readDump([memorySource('run.parquet', bytes)], { columns });
  await expect(read(parquet(TABLE), { brightness: 'note' })).rejects.toMatchObject({ code: 'dump/column-not-numeric' });
  await expect(read(parquet(TABLE), { brightness: 'nite' })).rejects.toMatchObject({
    code: 'dump/no-such-column',
    message: expect.stringContaining('did you mean "note"?'),
  });
  const gzip = parquet(TABLE, { codec: 'GZIP', compressors: { GZIP: (bytes: Uint8Array) => bytes } });
  await expect(read(gzip)).rejects.toMatchObject({
    code: 'dump/parquet-codec',
    message: expect.stringContaining('GZIP'),
  });
  const bytes = parquet(TABLE);
  await expect(read(bytes.slice(0, bytes.length - 5))).rejects.toMatchObject({ code: 'dump/corrupt-parquet' });
  await expect(read(bytes.slice(0, 200))).rejects.toMatchObject({ code: 'dump/corrupt-parquet' });
  await expect(readDump([memorySource('run.parquet', 'frame,x,y\n')])).rejects.toMatchObject({
    code: 'dump/not-parquet',
  });
  await expect(read(parquet(TABLE.map((c) => ({ ...c, data: [] }))))).rejects.toMatchObject({
    code: 'dump/header-only',
  });
});
