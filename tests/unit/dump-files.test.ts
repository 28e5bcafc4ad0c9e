import { frameFromName, naturalOrder } from '@wakeloom/tracker/detections/file-order';
import { describe, expect, it } from 'vitest';
import { flatRows, memorySource, readDump } from '../helpers/dump-sources.js';

describe('order and numbers of files', () => {
  it('sorts names as people count', () => {
    const names = [
      'f10.csv',
      'f9.csv',
      'f1.csv',
      'f010.csv',
      'a/f2.csv',
      'f.csv',
      'g1.csv',
      'f123456789012345678901.csv',
    ];
    expect(names.sort(naturalOrder)).toEqual([
      'a/f2.csv',
      'f1.csv',
      'f9.csv',
      'f010.csv',
      'f10.csv',
      'f123456789012345678901.csv',
      'f.csv',
      'g1.csv',
    ]);
  });

  it('takes the last number of the name', () => {
    expect(frameFromName('2024/run2_image_0042.csv.gz')).toBe(42);
    expect(frameFromName('C:\\data\\t5.h5')).toBe(5);
    expect(frameFromName('frame-7')).toBe(7);
    expect(() => frameFromName('12/frames.csv')).toThrow(expect.objectContaining({ code: 'dump/no-frame-in-name' }));
    expect(() => frameFromName('f99999999999.csv')).toThrow(expect.objectContaining({ code: 'dump/no-frame-in-name' }));
  });
});

describe('several files', () => {
  const run = (...files: [string, string][]) => files.map(([name, text]) => memorySource(name, text));

  it('reads parts of one run in the order given and counts rows over all', async () => {
    const { scan, blocks } = await readDump(
      run(['p10.csv', 'frame,x,y\n0,1,2\n1,3,4\n'], ['p2.csv', 'frame,y,x\n2,6,5\n']),
    );
    expect(scan.files.map(({ name }) => name)).toEqual(['p10.csv', 'p2.csv']);
    expect(scan.ordered).toBe(true);
    expect(flatRows(blocks).map((row) => [row[0], row[1], row[2], row[5]])).toEqual([
      [0, 1, 2, 0],
      [1, 3, 4, 1],
      [2, 5, 6, 2],
    ]);
  });

  it('joins a frame that ends one file and begins the next', async () => {
    const { scan, blocks } = await readDump(
      run(['a1.csv', 'frame,x,y\n0,1,2\n1,3,4\n'], ['a2.csv', 'frame,x,y\n1,3,4\n1,5,6\n']),
    );
    expect([...scan.frameCounts]).toEqual([1, 2]);
    expect(scan.setAside).toMatchObject([{ reason: 'same-place', examples: [{ file: 'a2.csv', line: 2 }] }]);
    expect(flatRows(blocks).map((row) => row[5])).toEqual([0, 1, 3]);
  });

  it('takes the header of the first part for parts without one', async () => {
    const { scan } = await readDump(run(['a1.csv', 'frame,x,y\n0,1,2\n'], ['a2.csv', '1,3,4\n']));
    expect(scan).toMatchObject({ rowsPresent: 2, rowsRead: 2 });
  });

  it('reads one file a frame, number from the name', async () => {
    const { scan, blocks } = await readDump(
      run(['f_0012.csv', 'x,y\n5,6\n'], ['f_0003.csv', 'x,y\n1,2\n3,4\n'], ['f_0007.csv', 'x,y\n'], ['f_0008.csv', '']),
      { layout: 'frame-from-name' },
    );
    expect(flatRows(blocks).map((row) => row.slice(0, 3))).toEqual([
      [3, 1, 2],
      [3, 3, 4],
      [12, 5, 6],
    ]);
    expect(scan.columns['frame']).toBe('last number in the file name');
    expect(scan.remarks.join('\n')).toContain('1 empty files, first f_0008.csv');
    expect(scan.remarks.join('\n')).toContain('1 files with a header and no row, first f_0007.csv');
  });

  it('reads one file a frame, number from the order given, without a header, and says when names count otherwise', async () => {
    const given = run(['f2.csv', '5 6\n'], ['f11.csv', '7 8\n'], ['f1.csv', '1 2\n3 4\n']);
    const { scan, blocks } = await readDump(given, { layout: 'frame-from-order' });
    expect(flatRows(blocks).map((row) => row.slice(0, 3))).toEqual([
      [0, 5, 6],
      [1, 7, 8],
      [2, 1, 2],
      [2, 3, 4],
    ]);
    expect(scan.remarks.join('\n')).toContain('not that of the numbers in their names (f11.csv before f1.csv)');
    const counted = await readDump(run(['f2.csv', '5 6\n'], ['f11.csv', '7 8\n']), { layout: 'frame-from-order' });
    expect(counted.scan.remarks.join('\n')).not.toContain('order given');
  });

  it('says when two names give one frame', async () => {
    const { scan } = await readDump(run(['a_1.csv', 'x,y\n5,6\n'], ['b_1.csv', 'x,y\n1,2\n']), {
      layout: 'frame-from-name',
    });
    expect([...scan.frameCounts]).toEqual([2]);
    expect(scan.remarks.join('\n')).toContain('repeat a frame number, first b_1.csv and a_1.csv (frame 1)');
  });

  it('refuses files that differ and a run of empty ones', async () => {
    await expect(
      readDump(run(['a1.csv', 'frame,x,y\n0,1,2\n'], ['a2.csv', 'frame,x,y,z\n1,3,4,5\n'])),
    ).rejects.toMatchObject({
      code: 'dump/files-differ',
      message: expect.stringContaining('a2.csv'),
    });
    await expect(readDump(run(['a1.csv', ''], ['a2.csv', '\n']))).rejects.toMatchObject({ code: 'dump/empty' });
  });
});

describe('rows out of frame order', () => {
  // Pathline by pathline: 40 pathlines through 30 frames, one place taken twice.
  const lines = ['frame,x,y,track'];
  for (let p = 0; p < 40; p++)
    for (let f = 0; f < 30; f++) lines.push(`${f * 3},${p},${p === 9 && f === 5 ? -1 : f},${p}`);
  lines.push('15,9,-1,77');
  const text = lines.join('\n');

  it('puts them in order, rows of one frame as they stood', async () => {
    const { scan, blocks } = await readDump([memorySource('run.csv', text)], {}, {}, 100);
    expect(scan).toMatchObject({ ordered: false, rowsPresent: 1201, rowsRead: 1200 });
    expect(scan.remarks.join('\n')).toContain('first at run.csv line 32: frame 0 after frame 87');
    expect(scan.setAside).toMatchObject([
      { reason: 'same-place', count: 1, examples: [{ file: 'run.csv', line: 1202 }] },
    ]);
    expect([...scan.frameNumbers]).toEqual(Array.from({ length: 30 }, (_, f) => 3 * f));
    expect([...scan.frameCounts]).toEqual(Array.from({ length: 30 }, () => 40));
    const rows = flatRows(blocks);
    expect(rows.map((row) => [row[0], row[1], row[5], row[6]])).toEqual(
      Array.from({ length: 1200 }, (_, i) => [
        3 * Math.floor(i / 40),
        i % 40,
        (i % 40) * 30 + Math.floor(i / 40),
        i % 40,
      ]),
    );
    expect(blocks.every((block) => block.x.length <= 100)).toBe(true);
  });

  it('can be read again', async () => {
    const first = flatRows((await readDump([memorySource('run.csv', text)])).blocks);
    const shuffled = [lines[0], ...lines.slice(1).reverse()].join('\n');
    const second = flatRows((await readDump([memorySource('run.csv', shuffled)])).blocks);
    const key = (row: number[]) => row.slice(0, 3).join();
    expect(second.map(key).sort()).toEqual(first.map(key).sort());
  });

  it('fails beyond the RAM limit with need and limit', async () => {
    await expect(readDump([memorySource('run.csv', text)], {}, { ramLimit: 20_000 })).rejects.toMatchObject({
      code: 'dump/order-needs-ram',
      // 1201 rows of x, y, row (8 bytes each), line and pathline (4 each), 30 frames of 64.
      details: { rows: 1201, need: 1201 * 32 + 30 * 64, limit: 20_000 },
      message: expect.stringContaining('--ram-limit'),
    });
  });

  it('streams ordered rows whatever the limit', async () => {
    expect((await readDump([memorySource('run.csv', '0,1,2\n1,1,2\n')], {}, { ramLimit: 1 })).scan.ordered).toBe(true);
  });
});
