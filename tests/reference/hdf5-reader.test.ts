import { execFileSync } from 'node:child_process';
import { mkdtempSync, readdirSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import type { ByteSource } from '@wakeloom/tracker';
import { nodeHdf5, openFileSource } from '@wakeloom/tracker/node';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { needs } from '../helpers/need.js';

/** Files as other people's software writes them. */
const SCRIPT = `
import sys, h5py, numpy
with h5py.File(sys.argv[1], "w") as f:
    f.attrs["title"] = "made"
    g = f.create_group("run/detections")
    g.create_dataset("x", data=numpy.arange(10) / 4.0)
    g["x"].attrs["units"] = "px"
    g["x"].attrs["range"] = [0.0, 2.5]
    g.create_dataset("y", data=numpy.arange(10, dtype=">f4") * 1.5, dtype=">f4")
    g.create_dataset("frame", data=numpy.arange(10, dtype="int64") * 2**40 - 3)
    g.create_dataset("big", data=numpy.arange(10, dtype=">u2"), dtype=">u2", chunks=(4,), compression="gzip")
    g.create_dataset("names", data=[b"a"] * 10)
    g.create_dataset("both", data=numpy.arange(20, dtype="i1").reshape(10, 2))
    table = numpy.zeros(5, dtype=[("frame", "<i4"), ("x", ">f8"), ("label", "S3"), ("y", "<f4")])
    table["frame"] = [1, 2, 3, 4, 5]
    table["x"] = [0.5, 1.5, 2.5, 3.5, 4.5]
    table["y"] = [-1, -2, -3, -4, -5]
    f.create_dataset("table", data=table)
`;

const python = needs('python3-h5py');
const folder = mkdtempSync(join(tmpdir(), 'hdf5-reader-'));
const path = join(folder, 'made.h5');
afterAll(() => rmSync(folder, { recursive: true, force: true }));

/** The same bytes without a path, as a Blob would be. */
async function withoutPath(): Promise<ByteSource> {
  const source = await openFileSource(path);
  return { ...source };
}

describe.skipIf(!python)('HDF5 files written by h5py', () => {
  beforeAll(() => {
    execFileSync('/usr/bin/python3', ['-c', SCRIPT, path]);
  });

  it.each([
    ['opened in place', () => openFileSource(path)],
    ['copied first', withoutPath],
  ])('are read whole, %s', async (_, open) => {
    const before = readdirSync(tmpdir()).filter((name) => name.startsWith('wakeloom-hdf5-')).length;
    const source = await open();
    const reader = await nodeHdf5.open(source);
    expect(reader.datasets()).toEqual([
      '/run/detections/big',
      '/run/detections/both',
      '/run/detections/frame',
      '/run/detections/x',
      '/run/detections/y',
      '/table:frame',
      '/table:x',
      '/table:y',
    ]);
    expect(reader.datasets('run/detections')).toHaveLength(5);
    const rows = (name: string, start: number, end: number) => reader.dataset(name)?.rows(start, end);
    expect(rows('/run/detections/x', 2, 5)).toEqual(Float64Array.of(0.5, 0.75, 1));
    expect(rows('/run/detections/y', 8, 99)).toEqual(Float32Array.of(12, 13.5));
    expect(rows('/run/detections/frame', 0, 3)).toEqual(Float64Array.of(-3, 2 ** 40 - 3, 2 ** 41 - 3));
    expect(rows('/run/detections/big', 3, 6)).toEqual(Uint16Array.of(3, 4, 5));
    expect(rows('/run/detections/both', 1, 3)).toEqual(Int8Array.of(2, 3, 4, 5));
    expect(rows('/table:frame', 1, 3)).toEqual(Int32Array.of(2, 3));
    expect(rows('table:x', 0, 5)).toEqual(Float64Array.of(0.5, 1.5, 2.5, 3.5, 4.5));
    expect(rows('/table:y', 4, 5)).toEqual(Float32Array.of(-5));
    expect(reader.dataset('/table:label')).toBeNull();
    expect(reader.dataset('/run/nothing')).toBeNull();
    expect(reader.attribute('title')).toBe('made');
    expect(reader.attribute('none')).toBeNull();
    expect(reader.dataset('/run/detections/x')?.attribute('units')).toBe('px');
    expect(reader.dataset('/run/detections/x')?.attribute('range')).toEqual([0, 2.5]);
    reader.close();
    reader.close();
    await source.close();
    expect(readdirSync(tmpdir()).filter((name) => name.startsWith('wakeloom-hdf5-')).length).toBe(before);
  });
});

it('bytes that are no HDF5 are refused, and the next file opens', async () => {
  const wrong = join(folder, 'wrong.h5');
  writeFileSync(wrong, 'frame,x,y\n1,2,3\n');
  const source = await openFileSource(wrong);
  await expect(nodeHdf5.open(source)).rejects.toMatchObject({ code: 'dump/not-hdf5' });
  await expect(nodeHdf5.open({ ...source })).rejects.toMatchObject({ code: 'dump/not-hdf5' });
  await source.close();
});
