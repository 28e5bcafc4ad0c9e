import { execFileSync } from 'node:child_process';
import { mkdtempSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { nodeHdf5, openFileSource } from '@wakeloom/tracker/node';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { type DumpOptions, flatRows, memorySource, readDump } from '../helpers/dump-sources.js';
import { needs } from '../helpers/need.js';

const ROWS = 20_000;

/** Writes the same detections the ways people store them, by h5py. */
const SCRIPT = `
import sys, numpy as np, h5py
n = ${ROWS}
i = np.arange(n)
frame, x, y = i // 16, i + 0.25, (i * 31) % 977
with h5py.File(sys.argv[1] + '/columns.h5', 'w') as f:
    g = f.create_group('run/detections')
    g.create_dataset('frame', data=frame.astype('<i8'))
    g.create_dataset('x', data=x.astype('<f8'), chunks=(1000,), compression='gzip')
    g.create_dataset('y', data=y.astype('>f4'))
    f.create_dataset('run/notes', data=np.array([b'abc']))
with h5py.File(sys.argv[1] + '/table.h5', 'w') as f:
    f.create_dataset('table', data=np.stack([frame, x, y], axis=1))
    f.create_dataset('other', data=np.zeros((3, 2)))
with h5py.File(sys.argv[1] + '/records.h5', 'w') as f:
    r = np.zeros(n, dtype=[('frame', '<i4'), ('x', '<f8'), ('name', 'S3'), ('y', '<f4')])
    r['frame'], r['x'], r['y'] = frame, x, y
    f.create_dataset('records', data=r)
with h5py.File(sys.argv[1] + '/unequal.h5', 'w') as f:
    f['frame'], f['x'], f['y'] = frame, x[:-1], y
`;

describe.skipIf(!needs('python3-h5py'))('HDF5 as h5py writes it', () => {
  let folder = '';
  beforeAll(() => {
    folder = mkdtempSync(join(tmpdir(), 'wakeloom-test-'));
    execFileSync('/usr/bin/python3', ['-c', SCRIPT, folder]);
  });
  afterAll(() => rmSync(folder, { recursive: true, force: true }));

  async function read(name: string, options: DumpOptions = {}) {
    const source = await openFileSource(join(folder, name));
    try {
      return await readDump([source], options, { hdf5: nodeHdf5 });
    } finally {
      await source.close();
    }
  }
  const whole = (row: number[], i: number) => row[0] === i >> 4 && row[1] === i + 0.25 && row[2] === (i * 31) % 977;

  it.each([
    ['columns', 'columns.h5', {}],
    ['columns below a group', 'columns.h5', { dataset: 'run/detections' }],
    ['a table', 'table.h5', { dataset: '/table' }],
    ['a table by position', 'table.h5', { dataset: 'table', columns: { frame: 0, x: 1, y: 2 } }],
    ['records', 'records.h5', {}],
    ['records by path', 'records.h5', { dataset: 'records' }],
  ])('reads %s', async (_, file, options) => {
    const { scan, blocks } = await read(file, options);
    expect(scan).toMatchObject({ format: 'hdf5', rowsPresent: ROWS, rowsRead: ROWS });
    const rows = flatRows(blocks);
    expect(rows).toHaveLength(ROWS);
    expect(rows.every(whole)).toBe(true);
  });

  it('refuses what is not clear, with the paths there are', async () => {
    await expect(read('table.h5')).rejects.toMatchObject({
      code: 'dump/datasets-unclear',
      message: expect.stringContaining(`/table (${ROWS} x 3)`),
    });
    await expect(read('columns.h5', { dataset: 'nowhere' })).rejects.toMatchObject({
      code: 'dump/no-such-dataset',
      message: expect.stringContaining('/run/detections/x'),
    });
    await expect(read('unequal.h5')).rejects.toMatchObject({
      code: 'dump/columns-differ-in-length',
      message: expect.stringContaining(`${ROWS - 1} in /x`),
    });
  });

  it('refuses a file cut short with a code', async () => {
    const bytes = readFileSync(join(folder, 'columns.h5'));
    for (const share of [0.1, 0.5, 0.95]) {
      const cut = memorySource('cut.h5', bytes.subarray(0, Math.floor(bytes.length * share)));
      await expect(readDump([cut], {}, { hdf5: nodeHdf5 })).rejects.toMatchObject({
        code: expect.stringMatching(/^dump\/(not|corrupt)-hdf5$/),
      });
    }
  });
});

it('says so when there is no HDF5 reader, and when the bytes are none', async () => {
  const magic = Uint8Array.from([0x89, 0x48, 0x44, 0x46, 0x0d, 0x0a, 0x1a, 0x0a, 0, 0]);
  await expect(readDump([memorySource('run.h5', magic)])).rejects.toMatchObject({ code: 'dump/no-hdf5-reader' });
  await expect(readDump([memorySource('run.h5', 'frame,x,y\n')])).rejects.toMatchObject({ code: 'dump/not-hdf5' });
});
