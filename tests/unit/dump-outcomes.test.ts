import { createContext, type DumpScan, type RunEvent, type SetAside } from '@wakeloom/tracker';
import { openDump } from '@wakeloom/tracker/detections/open-dump';
import { describe, expect, it } from 'vitest';
import { dumpSettings, flatRows, memorySource, readDump, readText, testTools } from '../helpers/dump-sources.js';

function aside(scan: DumpScan, reason: SetAside['reason']): SetAside {
  const found = scan.setAside.find((entry) => entry.reason === reason);
  if (found === undefined) throw new Error(`nothing set aside for ${reason}: ${JSON.stringify(scan.setAside)}`);
  return found;
}

describe('dumps without rows', () => {
  it.each([
    ['nothing', ''],
    ['blank lines and comments', '\n# frame x y\n   \n'],
    ['a byte-order mark', '\uFEFF'],
  ])('refuses %s', async (_, text) => {
    await expect(readText(text)).rejects.toMatchObject({
      code: 'dump/empty',
      message: expect.stringContaining('run.csv'),
    });
  });

  it('refuses a header alone', async () => {
    await expect(readText('frame,x,y\n')).rejects.toMatchObject({
      code: 'dump/header-only',
      message: expect.stringContaining('run.csv'),
    });
  });

  it('refuses no file, binary files, UTF-16, old line ends and endless lines', async () => {
    expect(() => openDump([], dumpSettings(), testTools)).toThrow(expect.objectContaining({ code: 'dump/no-files' }));
    const binary = Uint8Array.from({ length: 4096 }, (_, i) => (i * 37) % 32);
    await expect(readDump([memorySource('run.dat', binary)])).rejects.toMatchObject({ code: 'dump/not-text' });
    const wide = Uint8Array.from([0xff, 0xfe, 0x30, 0x00]);
    await expect(readDump([memorySource('run.csv', wide)])).rejects.toMatchObject({ code: 'dump/utf-16' });
    await expect(readText('frame,x,y\r0,1,2\r1,1,2\r')).rejects.toMatchObject({ code: 'dump/old-line-ends' });
    await expect(readText(`frame,x,y\n0,1,2\n${'1'.repeat(1 << 21)}\n`)).rejects.toMatchObject({
      code: 'dump/line-too-long',
      message: expect.stringContaining('line 3'),
    });
    await expect(readText('just words\nand more of them\n')).rejects.toMatchObject({ code: 'dump/no-such-column' });
    await expect(readText('oneword\n17\n18\n')).rejects.toMatchObject({ code: 'dump/no-separator' });
  });
});

describe('rows set aside', () => {
  const text = [
    'frame,x,y,time', // line 1
    '0,1,2,0', //         2
    '0,3,4', //           3: too few fields
    '0,3,4,0,9', //       4: too many
    '# a comment', //     5
    '0,3e,4,0', //        6: text in a number
    '0,,4,0', //          7: nothing in a number
    '0,NaN,4,0', //       8
    '0,3,-inf,0', //      9
    '0,1e999,4,0', //    10: beyond Float64
    '0.5,3,4,0', //      11
    '3e9,3,4,0', //      12: beyond Int32
    '0,1,2,0', //        13: the place of line 2
    '0,3,4,nan', //      14
    '0,3,4,0', //        15
    '1,1,2,1', //        16
  ].join('\n');

  it('counts each reason and names file, line and what was found', async () => {
    const { scan, blocks } = await readText(text, { badRowsLimit: 0.9 });
    expect(scan.rowsPresent).toBe(14);
    expect(scan.rowsRead).toBe(3);
    expect(scan.setAside.map(({ reason, count }) => [reason, count])).toEqual([
      ['frame-not-whole', 1],
      ['frame-out-of-range', 1],
      ['not-a-number', 2],
      ['not-finite', 3],
      ['same-place', 1],
      ['time-not-finite', 1],
      ['wrong-field-count', 2],
    ]);
    const lines = (reason: SetAside['reason']) => aside(scan, reason).examples.map(({ line }) => line);
    expect(lines('wrong-field-count')).toEqual([3, 4]);
    expect(lines('not-a-number')).toEqual([6, 7]);
    expect(lines('not-finite')).toEqual([8, 9, 10]);
    expect(lines('frame-not-whole')).toEqual([11]);
    expect(lines('frame-out-of-range')).toEqual([12]);
    expect(lines('same-place')).toEqual([13]);
    expect(lines('time-not-finite')).toEqual([14]);
    expect(aside(scan, 'not-a-number').examples[0]).toEqual({ file: 'run.csv', line: 6, found: 'x is "3e"' });
    expect(aside(scan, 'wrong-field-count').examples[0].found).toBe('3 fields instead of 4: "0,3,4"');
    expect(aside(scan, 'same-place').examples[0].found).toContain('frame 0');
    // The rows that stay keep their number among all rows present: comments and header are none.
    expect(flatRows(blocks).map((row) => [row[0], row[1], row[5]])).toEqual([
      [0, 1, 0],
      [0, 3, 12],
      [1, 1, 13],
    ]);
  });

  it('tells them as events', async () => {
    const events: RunEvent[] = [];
    const dump = openDump([memorySource('run.csv', text)], dumpSettings({ badRowsLimit: 0.9 }), testTools);
    await dump.scan(createContext({ onEvent: (event) => events.push(event) }));
    const told = events.filter(({ code }) => code === 'dump/row-set-aside');
    expect(told).toHaveLength(7);
    expect(told.map(({ message }) => message).join('\n')).toContain('run.csv line 6: x is "3e"');
  });

  it('fails past the limit with the counts', async () => {
    await expect(readText(text, { badRowsLimit: 0.5 })).rejects.toMatchObject({
      code: 'dump/too-many-bad-rows',
      message: expect.stringContaining('11 of 14 set aside'),
      details: { rowsPresent: 14, setAside: 11, 'not-a-number': 2 },
    });
    await expect(readText('frame,x,y\n0,a,b\n', { badRowsLimit: 1 })).rejects.toMatchObject({
      code: 'dump/too-many-bad-rows',
    });
  });

  it('sets corrupt bytes aside and names them in print', async () => {
    const bytes = new TextEncoder().encode('frame,x,y\n0,1,2\n0,1?3,2\n1,1,2\n');
    bytes[bytes.indexOf(63)] = 0xfe;
    const { scan } = await readDump([memorySource('run.csv', bytes)]);
    expect(aside(scan, 'not-a-number').examples).toEqual([{ file: 'run.csv', line: 3, found: 'x is "1\\xfe3"' }]);
  });

  it('names five at most', async () => {
    const { scan } = await readText(
      `frame,x,y\n${'0,1\n'.repeat(9)}${Array.from({ length: 9 }, (_, i) => `0,${i},0\n`).join('')}`,
    );
    expect(aside(scan, 'wrong-field-count')).toMatchObject({ count: 9 });
    expect(aside(scan, 'wrong-field-count').examples.map(({ line }) => line)).toEqual([2, 3, 4, 5, 6]);
  });

  it('keeps two detections at one place in two frames, and tells 3-D places apart by z', async () => {
    expect((await readText('frame,x,y\n0,1,2\n1,1,2\n')).scan.rowsRead).toBe(2);
    const { scan } = await readText('frame,x,y,z\n0,1,2,3\n0,1,2,4\n0,1,2,3\n0,-0,2,3\n0,0,2,3\n');
    expect(scan.rowsRead).toBe(3);
    expect(aside(scan, 'same-place').examples.map(({ line }) => line)).toEqual([4, 6]);
  });

  it('names the second file and its own lines', async () => {
    const { scan } = await readDump([
      memorySource('run_10.csv', 'frame,x,y\n2,1,2\n2,x,2\n'),
      memorySource('run_9.csv', 'frame,x,y\n0,1,2\n1,1,2\n'),
    ]);
    expect(aside(scan, 'not-a-number').examples).toEqual([{ file: 'run_10.csv', line: 3, found: 'x is "x"' }]);
  });
});

describe('frame numbers', () => {
  it('keeps a jump by a million and says where', async () => {
    const { scan } = await readText('frame,x,y\n0,1,2\n1,1,2\n1000001,1,2\n1000002,1,2\n');
    expect([...scan.frameNumbers]).toEqual([0, 1, 1000001, 1000002]);
    expect(scan.remarks.join('\n')).toContain('first from 1 to 1000001 (run.csv line 4)');
  });

  it('counts missing frames', async () => {
    const { scan } = await readText('frame,x,y\n0,1,2\n3,1,2\n4,1,2\n6,1,2\n');
    expect(scan.ordered).toBe(true);
    expect(scan.remarks.join('\n')).toContain(
      '3 frame numbers without any detection between frames that have some, first 1',
    );
  });

  it('takes negative frame numbers', async () => {
    const { scan } = await readText('frame,x,y\n-2147483648,1,2\n-1,1,2\n2147483647,1,2\n');
    expect([...scan.frameNumbers]).toEqual([-2147483648, -1, 2147483647]);
  });
});

describe('a time column', () => {
  it('gives each frame the time of most of its rows and says where one differs', async () => {
    const { scan, blocks } = await readText('frame,x,y,time\n0,1,2,9\n0,2,2,0.5\n0,3,2,0.5\n1,1,2,0.75\n');
    expect([...blocks[0].time]).toEqual([0.5, 0.75]);
    expect(scan.remarks.join('\n')).toContain(
      '1 rows with another time than most rows of their frame, first in frame 0 (run.csv line 2)',
    );
  });

  it('refuses times that differ in more rows than the limit', async () => {
    await expect(
      readText('frame,x,y,time\n0,1,2,0\n0,2,2,1\n0,3,2,2\n1,1,2,3\n1,2,2,4\n', { badRowsLimit: 0.1 }),
    ).rejects.toMatchObject({ code: 'dump/times-differ', message: expect.stringContaining('run.csv line') });
  });

  it('remarks on time that runs backwards', async () => {
    const { scan } = await readText('frame,x,y,time\n0,1,2,1\n1,1,2,0.5\n2,1,2,2\n');
    expect(scan.remarks.join('\n')).toContain(
      '1 frames whose time is not later than that of the frame before, first frame 1 (run.csv line 3)',
    );
  });
});

it('takes odd pathline numbers for not linked and says so', async () => {
  const { scan, blocks } = await readText('frame,x,y,track\n0,1,2,1.5\n0,2,2,5e9\n0,3,2,3\n0,4,2,-7\n');
  expect([...blocks[0].given]).toEqual([-1, -1, 3, -1]);
  expect(scan.remarks.join('\n')).toContain('2 pathline numbers');
});

it('asks for scan before blocks', async () => {
  const dump = openDump([memorySource('run.csv', '0,1,2\n')], dumpSettings(), testTools);
  await expect(dump.blocks(createContext()).next()).rejects.toMatchObject({ code: 'usage/scan-first' });
});

it('notices that a file changed between the readings', async () => {
  const before = 'frame,x,y\n0,1,2\n1,1,2\n';
  const sources = [memorySource('run.csv', before)];
  const dump = openDump(sources, dumpSettings(), testTools);
  await dump.scan(createContext());
  const grown = memorySource('run.csv', `${before}1,5,6\n`);
  Object.assign(sources[0], { read: grown.read });
  const blocks = async () => {
    for await (const _ of dump.blocks(createContext()));
  };
  await expect(blocks()).rejects.toMatchObject({ code: 'dump/changed' });
});

it('stops on request and tells progress in bytes', async () => {
  const text = `frame,x,y\n${Array.from({ length: 200_000 }, (_, i) => `${i >> 8},${i},0`).join('\n')}\n`;
  const seen: [string, number, number | null, string][] = [];
  const onProgress = (...call: [string, number, number | null, string]) => seen.push(call);
  const dump = openDump([memorySource('run.csv', text)], dumpSettings(), testTools);
  await dump.scan(createContext({ onProgress }));
  expect(seen.at(-1)).toEqual(['read', text.length, text.length, 'bytes']);
  expect(seen.length).toBeGreaterThan(1);

  const controller = new AbortController();
  const context = createContext({ signal: controller.signal, onProgress: () => controller.abort() });
  await expect(dump.scan(context)).rejects.toMatchObject({ code: 'run/aborted' });
});

it('passes on a failing disk with the file and the byte', async () => {
  const source = {
    ...memorySource('run.csv', '0,1,2\n'),
    read: async () => Promise.reject(new Error('EIO: i/o error')),
  };
  await expect(readDump([source])).rejects.toMatchObject({
    code: 'dump/read-failed',
    message: expect.stringMatching(/EIO.*run\.csv/),
  });
});
