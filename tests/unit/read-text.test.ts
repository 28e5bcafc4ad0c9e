import { describe, expect, it } from 'vitest';
import { flatRows, memorySource, readDump, readText } from '../helpers/dump-sources.js';

/** Three detections in two frames, in whatever form: frame, x, y. */
const ROWS = [
  [0, 1.5, 2.25],
  [0, -3, 4.125],
  [1, 5.5, 6],
];

async function positions(text: string, options: Parameters<typeof readText>[1] = {}): Promise<number[][]> {
  const { blocks } = await readText(text, options);
  return flatRows(blocks).map((row) => row.slice(0, 3));
}

describe('how a text dump may be written', () => {
  it.each([
    ['commas', 'frame,x,y\n0,1.5,2.25\n0,-3,4.125\n1,5.5,6\n'],
    ['commas and blanks', 'frame, x, y\n0, 1.5, 2.25\n0, -3, 4.125\n1, 5.5, 6\n'],
    ['semicolons', 'frame;x;y\n0;1.5;2.25\n0;-3;4.125\n1;5.5;6\n'],
    ['semicolons and decimal commas', 'frame;x;y\n0;1,5;2,25\n0;-3;4,125\n1;5,5;6\n'],
    ['tabs', 'frame\tx\ty\n0\t1.5\t2.25\n0\t-3\t4.125\n1\t5.5\t6\n'],
    ['tabs and decimal commas', 'frame\tx\ty\n0\t1,5\t2,25\n0\t-3\t4,125\n1\t5,5\t6\n'],
    ['runs of blanks', 'frame    x       y\n    0  1.5    2.25\n    0   -3   4.125  \n    1  5.5       6\n'],
    ['blanks and decimal commas', 'frame x y\n0 1,5 2,25\n0 -3 4,125\n1 5,5 6\n'],
    ['no header', '0,1.5,2.25\n0,-3,4.125\n1,5.5,6\n'],
    ['CRLF', 'frame,x,y\r\n0,1.5,2.25\r\n0,-3,4.125\r\n1,5.5,6\r\n'],
    ['no line end at the end', 'frame,x,y\n0,1.5,2.25\n0,-3,4.125\n1,5.5,6'],
    ['a byte-order mark', '\uFEFFframe,x,y\n0,1.5,2.25\n0,-3,4.125\n1,5.5,6\n'],
    ['comments and blank lines', '# made by hand\n\nframe,x,y\n0,1.5,2.25\n# half way\n  \n0,-3,4.125\n1,5.5,6\n\n'],
    ['a header in a comment', '# rate 60 Hz\n# frame x y\n0 1.5 2.25\n0 -3 4.125\n1 5.5 6\n'],
    ['exponents', 'frame,x,y\n0e0,1.5E0,225e-2\n0,-.3e+1,4125d-3\n1,+5.5,6.\n'],
    ['quotes', '"frame","x","y","note"\n0,"1.5",2.25,"a, b"\n0,-3,4.125,""\n1,5.5,6,"c"\n'],
    ['other columns in between', 'id,y_px,size,x_px,frame\n7,2.25,3,1.5,0\n8,4.125,3,-3,0\n9,6,3,5.5,1\n'],
    ['units in brackets', 'Frame,X [mm],Y (mm)\n0,1.5,2.25\n0,-3,4.125\n1,5.5,6\n'],
    ['a separator at each line end', 'frame,x,y\n0,1.5,2.25,\n0,-3,4.125,\n1,5.5,6,\n'],
  ])('reads %s', async (_, text) => {
    expect(await positions(text)).toEqual(ROWS);
  });

  it('reads the same rows however the bytes come', async () => {
    const text = 'frame,x,y\r\n0,1.5,2.25\r\n0,-3,4.125\r\n1,5.5,6\r\n';
    for (const pieces of [1, 2, 3, 7]) {
      const { blocks } = await readDump([memorySource('run.csv', text, pieces)]);
      expect(flatRows(blocks).map((row) => row.slice(0, 3))).toEqual(ROWS);
    }
  });

  it('reads lines across the borders of its buffer', async () => {
    // 1 MiB of buffer and rows of 22 to 29 bytes: borders fall everywhere within a line.
    const rows = Array.from(
      { length: 90_000 },
      (_, i) => `${i >> 6},${i}.125,${(i * 7) % 1000}.5,${'x'.repeat(i % 8)}`,
    );
    const { scan, blocks } = await readText(`frame,x,y,note\n${rows.join('\n')}\n`);
    expect(scan.rowsRead).toBe(90_000);
    const read = flatRows(blocks);
    expect(read.every((row, i) => row[0] === i >> 6 && row[1] === i + 0.125 && row[2] === ((i * 7) % 1000) + 0.5)).toBe(
      true,
    );
  });

  it('keeps brightness, pathline numbers and times', async () => {
    const text = 'frame,x,y,z,intensity,track,time\n0,1,2,3,40,7,0.5\n0,4,5,6,,-1,0.5\n1,7,8,9,nan,,0.75\n';
    const { scan, blocks } = await readText(text);
    expect(scan).toMatchObject({ dims: 3, has: { brightness: true, pathline: true, time: true } });
    expect(flatRows(blocks)).toEqual([
      [0, 1, 2, 3, 40, 0, 7, 0.5],
      [0, 4, 5, 6, Number.NaN, 1, -1, 0.5],
      [1, 7, 8, 9, Number.NaN, 2, -1, 0.75],
    ]);
    expect(scan.bounds).toEqual({ min: [1, 2, 3], max: [7, 8, 9] });
    expect(scan.columns).toMatchObject({ x: 'column 2 "x"', brightness: 'column 5 "intensity"' });
  });

  it('takes separator, decimal mark and header from the settings', async () => {
    expect(await positions('0 1,5 2,25\n', { separator: 'blank', decimal: 'comma' })).toEqual([ROWS[0]]);
    // Numbers in the first line, said to be a header.
    expect(await positions('1,2,3\n0,1.5,2.25\n', { header: 'yes', columns: { frame: 0, x: 1, y: 2 } })).toEqual([
      ROWS[0],
    ]);
    await expect(positions('0,1,2\n', { separator: 'comma', decimal: 'comma' })).rejects.toMatchObject({
      code: 'dump/decimal-is-separator',
    });
  });

  it('cuts blocks at frames', async () => {
    const text = Array.from({ length: 40 }, (_, i) => `${i >> 2},${i},0`).join('\n');
    const { blocks } = await readDump([memorySource('run.csv', text)], {}, {}, 10);
    expect(blocks.map((block) => block.number.length)).toEqual([3, 3, 3, 1]);
    expect(blocks.map((block) => [...block.offsets])).toEqual([
      [0, 4, 8, 12],
      [0, 4, 8, 12],
      [0, 4, 8, 12],
      [0, 4],
    ]);
    expect(blocks.flatMap((block) => [...block.row])).toEqual(Array.from({ length: 40 }, (_, i) => i));
  });
});

describe('which columns are taken', () => {
  const text = 'n,pos,across,up,size\n1,0,10,20,30\n2,1,11,21,31\n';

  it('goes by name and by position', async () => {
    const expected = [
      [0, 10, 20],
      [1, 11, 21],
    ];
    expect(await positions(text, { columns: { frame: 'pos', x: 'ACROSS', y: 'up' } })).toEqual(expected);
    expect(await positions(text, { columns: { frame: 1, x: 2, y: 3 } })).toEqual(expected);
    expect(await positions('1,0,10,20\n2,1,11,21\n', { columns: { frame: 1, x: 2, y: 3 } })).toEqual(expected);
  });

  it('names the nearest column when one is missing', async () => {
    await expect(positions(text, { columns: { frame: 'pos', x: 'acros', y: 'up' } })).rejects.toMatchObject({
      code: 'dump/no-such-column',
      message: expect.stringContaining('did you mean "across"?'),
    });
    await expect(positions(text, { columns: { frame: 'pos', x: 9, y: 'up' } })).rejects.toMatchObject({
      code: 'dump/no-such-column',
      message: expect.stringContaining('expected 0 to 4'),
    });
    await expect(positions('frame,xs,y\n0,1,2\n')).rejects.toMatchObject({
      code: 'dump/no-such-column',
      message: expect.stringContaining('"xs"'),
    });
    await expect(positions('0,1,2\n', { columns: { frame: 'frame', x: 1, y: 2 } })).rejects.toMatchObject({
      code: 'dump/no-such-column',
      message: expect.stringContaining('no header'),
    });
  });

  it('does not guess', async () => {
    const unclear = { code: 'dump/columns-unclear' };
    await expect(positions('0,1,2,3\n0,2,3,4\n')).rejects.toMatchObject({
      ...unclear,
      message: expect.stringContaining('columns: { frame: 0, x: 1, y: 2 }'),
    });
    await expect(positions('0.5,1,2\n1.5,2,3\n')).rejects.toMatchObject(unclear);
    await expect(positions('frame,x_px,x_mm,y\n0,1,2,3\n')).rejects.toMatchObject({
      ...unclear,
      message: expect.stringContaining('"x_px", "x_mm"'),
    });
    await expect(positions(text, { columns: { frame: 'pos', x: 'up', y: 'up' } })).rejects.toMatchObject(unclear);
    await expect(positions('a,a,frame\n1,2,0\n', { columns: { x: 'a', y: 1 } })).rejects.toMatchObject(unclear);
  });

  it('takes x over x_mm, t for the frame only where nothing better is there, and no milliseconds for seconds', async () => {
    expect((await readText('frame,x_mm,x,y,t\n0,9,1,2,0.5\n')).scan.columns).toEqual({
      frame: 'column 1 "frame"',
      x: 'column 3 "x"',
      y: 'column 4 "y"',
      time: 'column 5 "t"',
    });
    expect((await readText('t,x,y\n0,1,2\n')).scan).toMatchObject({
      columns: { frame: 'column 1 "t"' },
      has: { time: false },
    });
    expect((await readText('frame,x,y,time [ms]\n0,1,2,3\n')).scan.has.time).toBe(false);
  });
});
