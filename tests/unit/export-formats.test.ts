import { execFileSync } from 'node:child_process';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { Base64Stream } from '@wakeloom/tracker/store/exports/base64';
import { exportGrid, exportPathlines } from '@wakeloom/tracker/store/exports/registry';
import { parquetMetadata, parquetReadObjects } from 'hyparquet';
import { afterAll, describe, expect, it } from 'vitest';
import { madeGrid, madeSource, madeValue, memorySink } from '../helpers/export-sources.js';
import { needs } from '../helpers/need.js';

const MM_S = { length: 'mm', time: 's' };
const folder = mkdtempSync(join(tmpdir(), 'wakeloom-exports-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));

// Debian's netCDF4 for Python brings numpy along.
const python = needs('python3-netcdf4');

function readWithPython<T>(name: string, bytes: Uint8Array): T {
  const path = join(folder, name);
  writeFileSync(path, bytes);
  const script = join(import.meta.dirname, '../helpers/read-exports.py');
  return JSON.parse(execFileSync('/usr/bin/python3', [script, path], { encoding: 'utf8' })) as T;
}

async function pathlines(
  format: string,
  ...args: [Parameters<typeof exportPathlines>[0], Parameters<typeof exportPathlines>[3]?]
) {
  const sink = memorySink();
  const summary = await exportPathlines(args[0], format, sink, args[1]);
  const bytes = sink.bytes();
  expect(summary.bytes).toBe(bytes.length);
  return bytes;
}

async function grid(format: string, dims: 2 | 3, options?: Parameters<typeof exportGrid>[4]) {
  const sink = memorySink();
  await exportGrid(madeGrid(dims), MM_S, format, sink, options);
  return sink.bytes();
}

describe('Parquet, read by hyparquet', () => {
  it.each([3, 100])('gives back pathlines written %i rows a group, with their units', async (rows) => {
    const bytes = await pathlines('parquet', madeSource(2, [3, 4]), { rows });
    const file = bytes.buffer as ArrayBuffer;
    const metadata = parquetMetadata(file);
    expect(metadata.row_groups.map((group) => Number(group.num_rows))).toEqual(rows === 3 ? [3, 3, 1] : [7]);
    const units = JSON.parse(metadata.key_value_metadata!.find((entry) => entry.key === 'units')!.value!) as Record<
      string,
      string
    >;
    expect(units).toMatchObject({ x: 'mm', u: 'mm/s', ax: 'mm/s2', t: 's', flags: '1' });
    const objects = await parquetReadObjects({ file });
    expect(objects).toHaveLength(7);
    objects.forEach((object, row) => {
      expect(object['pathline']).toBe(row < 3 ? 3 : 13);
      expect(object['detection']).toBe(BigInt(2 ** 40 + row));
      for (const name of ['x', 'u', 'ay', 'v_se', 'measured_x', 'link_risk'])
        expect(object[name]).toBe(madeValue(name, row));
      expect(object['t']).toBe(madeValue('time', row));
    });
  });

  it('holds NaN where image pairs have no acceleration and bins are empty', async () => {
    const pairs = await pathlines('parquet', madeSource(2, [2], true));
    const [first] = await parquetReadObjects({ file: pairs.buffer as ArrayBuffer });
    expect(first!['ax']).toBeNaN();
    expect(first!['u']).toBe(madeValue('u', 0));
    const bins = await parquetReadObjects({ file: (await grid('parquet', 3)).buffer as ArrayBuffer });
    expect(bins).toHaveLength(12);
    expect(bins[1]!['u']).toBeNaN();
    expect(bins[11]).toMatchObject({ x: 0, y: 1.5, z: 6, samples: 111, ww: madeValue('ww', 11) });
  });

  it('is a file of no rows for a result without samples', async () => {
    const file = (await pathlines('parquet', madeSource(2, []))).buffer as ArrayBuffer;
    expect(Number(parquetMetadata(file).num_rows)).toBe(0);
    expect(await parquetReadObjects({ file })).toEqual([]);
  });
});

interface Npy {
  readonly shape: number[];
  readonly types: string[];
  readonly columns: Record<string, (number | null)[]>;
}

describe.skipIf(!python)('NPY, read by numpy', () => {
  it('gives back pathlines as a structured array', async () => {
    const read = readWithPython<Npy>('pathlines.npy', await pathlines('npy', madeSource(3, [2, 3]), { rows: 2 }));
    expect(read.shape).toEqual([5]);
    expect(read.types.slice(0, 5)).toEqual(['<i4', '<i4', '<i8', '<f8', '<f8']);
    expect(read.columns['pathline']).toEqual([3, 3, 13, 13, 13]);
    expect(read.columns['detection']).toEqual([0, 1, 2, 3, 4].map((row) => 2 ** 40 + row));
    for (const name of ['z', 'w', 'az', 'w_se', 'az_se', 'measured_z']) {
      expect(read.columns[name], name).toEqual([0, 1, 2, 3, 4].map((row) => madeValue(name, row)));
    }
  });

  it('gives a grid its shape, slowest axis first, and NaN in empty bins', async () => {
    const read = readWithPython<Npy>('grid.npy', await grid('npy', 3));
    expect(read.shape).toEqual([2, 2, 3]);
    expect(read.columns['x']!.slice(0, 4)).toEqual([-1, -0.5, 0, -1]);
    expect(read.columns['u']![1]).toBeNull();
    expect(read.columns['u']![2]).toBe(madeValue('u', 2));
    expect(readWithPython<Npy>('plane.npy', await grid('npy', 2)).shape).toEqual([2, 3]);
  });
});

interface Vtk {
  readonly root: Record<string, string>;
  readonly body: Record<string, string>;
  readonly piece: Record<string, string>;
  readonly arrays: Record<string, { readonly components: number; readonly values: (number | null)[] }>;
}

describe.skipIf(!python)('VTK XML, read by an XML parser', () => {
  it('gives pathlines as polylines with vectors at their points', async () => {
    const read = readWithPython<Vtk>('pathlines.vtp', await pathlines('vtk', madeSource(2, [3, 1, 2]), { rows: 2 }));
    expect(read.root).toMatchObject({ type: 'PolyData', byte_order: 'LittleEndian', header_type: 'UInt64' });
    expect(read.piece).toMatchObject({ NumberOfPoints: '6', NumberOfLines: '3', NumberOfPolys: '0' });
    const { arrays } = read;
    expect(arrays['connectivity']!.values).toEqual([0, 1, 2, 3, 4, 5]);
    expect(arrays['offsets']!.values).toEqual([3, 4, 6]);
    expect(arrays['pathline']!.values).toEqual([3, 13, 23]);
    expect(arrays['Points']!.components).toBe(3);
    expect(arrays['Points']!.values.slice(3, 6)).toEqual([madeValue('x', 1), madeValue('y', 1), 0]);
    expect(arrays['velocity']!.values.slice(15)).toEqual([madeValue('u', 5), madeValue('v', 5), 0]);
    expect(arrays['acceleration']!.values).toHaveLength(18);
    expect(arrays['flags']!.values).toEqual([0, 1, 2, 3, 4, 5]);
    expect(arrays['detection']!.values[5]).toBe(2 ** 40 + 5);
    expect(Object.keys(arrays)).not.toContain('u');
  });

  it('leaves the acceleration of image pairs out', async () => {
    const { arrays } = readWithPython<Vtk>('pairs.vtp', await pathlines('vtk', madeSource(2, [2], true)));
    expect(Object.keys(arrays)).not.toContain('acceleration');
    expect(Object.keys(arrays)).toContain('velocity');
  });

  it('gives a grid as image data at the bin centres', async () => {
    const read = readWithPython<Vtk>('grid.vti', await grid('vtk', 3));
    expect(read.body).toEqual({ WholeExtent: '0 2 0 1 0 1', Origin: '-1 0.5 2', Spacing: '0.5 1 4' });
    expect(read.arrays['velocity']!.values.slice(6, 9)).toEqual(['u', 'v', 'w'].map((name) => madeValue(name, 2)));
    expect(read.arrays['velocity']!.values.slice(3, 6)).toEqual([null, null, null]);
    expect(read.arrays['samples']!.values).toHaveLength(12);
    expect(read.arrays['uw']!.values[11]).toBe(madeValue('uw', 11));
    const plane = readWithPython<Vtk>('plane.vti', await grid('vtk', 2, { normalise: { length: 0.5, speed: 2 } }));
    expect(plane.body).toEqual({ WholeExtent: '0 2 0 1 0 0', Origin: '-2 1 0', Spacing: '1 2 1' });
    expect(plane.arrays['velocity']!.values.slice(0, 3)).toEqual([madeValue('u', 0) / 2, madeValue('v', 0) / 2, 0]);
  });
});

describe('base64 in pieces', () => {
  it('equals that of Node however the bytes are cut', () => {
    const bytes = Uint8Array.from({ length: 50 }, (_, i) => (i * 37) % 256);
    for (let length = 0; length <= 50; length++) {
      for (const cut of [0, 1, 2, 3, 7, length]) {
        const stream = new Base64Stream();
        const parts = [
          stream.push(bytes.subarray(0, Math.min(cut, length))),
          stream.push(bytes.subarray(Math.min(cut, length), length)),
          stream.finish(),
        ];
        const text = Buffer.concat(parts).toString('latin1');
        expect(text).toBe(Buffer.from(bytes.subarray(0, length)).toString('base64'));
      }
    }
  });
});
