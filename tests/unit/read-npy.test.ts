import { expect, it } from 'vitest';
import { flatRows, memorySource, readDump } from '../helpers/dump-sources.js';
import { npySample } from '../helpers/npy-samples.js';

const ROWS = [
  [0, 1.5, 2.25],
  [0, -3, 4.125],
  [1, 5.5, 6],
];

it.each(['rows', 'columns', 'version2', 'records', 'bigEndian'] as const)(
  'reads what NumPy wrote: %s',
  async (name) => {
    const { scan, blocks } = await readDump([memorySource('run.npy', npySample(name))]);
    expect(scan).toMatchObject({ format: 'npy', rowsPresent: 3, rowsRead: 3 });
    expect(flatRows(blocks).map((row) => row.slice(0, 3))).toEqual(ROWS);
    if (name === 'records') expect([...blocks[0].brightness]).toEqual([7, 8, 255]);
  },
);

it('recognises the bytes whatever the name, and refuses the name without the bytes', async () => {
  expect((await readDump([memorySource('run.dat', npySample('rows'))])).scan.format).toBe('npy');
  await expect(readDump([memorySource('run.npy', '0,1,2\n')])).rejects.toMatchObject({ code: 'dump/not-npy' });
  await expect(readDump([memorySource('a.dat', '0,1,2\n')], { format: 'npy' })).rejects.toMatchObject({
    code: 'dump/not-npy',
  });
});

it('reads many rows in pieces, by rows and by columns', async () => {
  const rows = 30_000;
  for (const byColumn of [false, true]) {
    const header = `{'descr': '<f8', 'fortran_order': ${byColumn ? 'True' : 'False'}, 'shape': (${rows}, 3), }`;
    const text = `\x93NUMPY\x01\x00v\x00${header.padEnd(117)}\n`;
    const bytes = new Uint8Array(128 + rows * 24);
    for (let i = 0; i < 128; i++) bytes[i] = text.charCodeAt(i);
    const values = new Float64Array(bytes.buffer, 128);
    for (let i = 0; i < rows; i++) {
      const row = [i >> 5, i + 0.25, (i * 31) % 977];
      row.forEach((value, c) => {
        values[byColumn ? c * rows + i : 3 * i + c] = value;
      });
    }
    const { scan, blocks } = await readDump([memorySource('run.npy', bytes)]);
    expect(scan.rowsRead).toBe(rows);
    const read = flatRows(blocks);
    expect(read.every((row, i) => row[0] === i >> 5 && row[1] === i + 0.25 && row[2] === (i * 31) % 977)).toBe(true);
  }
});

it('refuses what it cannot take, with the reason', async () => {
  const read = (bytes: Uint8Array) => readDump([memorySource('run.npy', bytes)]);
  await expect(read(npySample('flat'))).rejects.toMatchObject({ code: 'dump/npy-kind' });
  await expect(read(npySample('complexNumbers'))).rejects.toMatchObject({
    code: 'dump/npy-kind',
    message: expect.stringContaining('<c16'),
  });
  await expect(read(npySample('empty'))).rejects.toMatchObject({ code: 'dump/header-only' });
  const whole = npySample('rows');
  await expect(read(whole.slice(0, whole.length - 1))).rejects.toMatchObject({ code: 'dump/truncated-npy' });
  await expect(read(whole.slice(0, 40))).rejects.toMatchObject({ code: expect.stringMatching(/^dump\/.*npy$/) });
  await expect(read(new Uint8Array([...whole, 0]))).rejects.toMatchObject({ code: 'dump/corrupt-npy' });
});

it('sets rows aside and names them by number where there are no lines', async () => {
  const bytes = npySample('rows');
  // The x of the second row: 128 bytes of header, then 24 bytes a row.
  new DataView(bytes.buffer).setFloat64(128 + 24 + 8, Number.NaN, true);
  const { scan } = await readDump([memorySource('run.npy', bytes)]);
  expect(scan.setAside).toEqual([
    {
      reason: 'not-finite',
      count: 1,
      examples: [{ file: 'run.npy', line: 0, found: 'x is not a number in row 1 (counted from 0)' }],
    },
  ]);
});
