import { timeColumnWords, timeStep } from '@wakeloom/tracker/detections/time-column';
import type { ClockSettings } from '@wakeloom/tracker/run/settings';
import { describe, expect, it } from 'vitest';
import { dumpSettings, flatRows, memorySource, readDump, readText } from '../helpers/dump-sources.js';
import { needFailure } from '../helpers/failure.js';

const rate = (value: number): ClockSettings => ({
  kind: 'rate',
  rate: { value, unit: 'Hz', standardUncertainty: null },
});

describe('step of the time column', () => {
  const number = Int32Array.from({ length: 200 }, (_, k) => k + (k > 80 ? 7 : 0));

  it('is seconds a frame number across missing frames, exact where the times are', () => {
    expect(
      timeStep(
        number,
        Float64Array.from(number, (k) => 5 + k / 64),
      ),
    ).toBe(1 / 64);
  });

  it('bears times rounded to a millisecond and one that is corrupt', () => {
    const rounded = Float64Array.from(number, (k) => Math.round(1000 * (k / 60)) / 1000);
    rounded[199] = 1e9;
    rounded[3] = 0;
    // Half a millisecond at both ends over 100 frames of 16.7 ms: 0.06 % at most.
    expect(Math.abs(60 * timeStep(number, rounded) - 1)).toBeLessThan(6e-4);
  });

  it('is unknown with fewer than two frames or without times', () => {
    expect(timeStep(Int32Array.of(4), Float64Array.of(1))).toBeNaN();
    expect(timeStep(Int32Array.of(4, 5), new Float64Array(0))).toBeNaN();
  });
});

describe('a time column that is not the clock', () => {
  const text = `frame,t,x,y\n${[0, 1, 2, 3].map((k) => `${k},${k / 50},${k},1`).join('\n')}\n`;

  it('is told of, with the way to use it', async () => {
    const { scan } = await readText(text);
    expect(timeColumnWords(scan, { kind: 'none' }, 1)).toEqual({
      note: 'column "t" found, not used as the clock; add --times yes (run sheet: clock: { times: yes }) to use it',
      warning: null,
    });
    expect(timeColumnWords(scan, { kind: 'times' }, 1)).toEqual({ note: null, warning: null });
    const { scan: without } = await readText('frame,x,y\n0,1,2\n1,1,2\n');
    expect(timeColumnWords(without, { kind: 'none' }, 1)).toEqual({ note: null, warning: null });
  });

  it('warns with both figures where the rate differs by more than 0.1 %', async () => {
    const { scan } = await readText(text);
    expect(timeColumnWords(scan, rate(50), 1).warning).toBeNull();
    expect(timeColumnWords(scan, rate(50.04), 1).warning).toBeNull();
    const { note, warning } = timeColumnWords(scan, rate(60), 1);
    expect(note).toContain('add --times yes and leave out the rate');
    expect(warning).toMatch(/got 0\.02 s a frame in column "t", expected 0\.0166667 s at 60 Hz \(\+20 %\)/);
    expect(timeColumnWords(scan, rate(50.1), 1).warning).toContain('(+0.2 %)');
    // A dump of every second frame number: one recorded frame is two numbers.
    expect(timeColumnWords(scan, rate(25), 2).warning).toBeNull();
  });
});

describe('frames numbered by times', () => {
  const rows = ['0.5,10,1', '0.5,11,1', '0.25,20,2', '1.5,30,3', '0.25,21,2'];
  const text = `t,x,y\n${rows.join('\n')}\n`;

  it('takes distinct times in ascending order, whatever the order of the rows', async () => {
    const { scan, blocks } = await readText(text, { timesAreClock: true });
    expect([...scan.frameNumbers]).toEqual([0, 1, 2]);
    expect(flatRows(blocks).map(([frame, x, , , , row, , time]) => [frame, x, row, time])).toEqual([
      [0, 20, 2, 0.25],
      [0, 21, 4, 0.25],
      [1, 10, 0, 0.5],
      [1, 11, 1, 0.5],
      [2, 30, 3, 1.5],
    ]);
    expect(scan.columns['time']).toBe('column 1 "t"');
    expect(scan.columns['frame']).toBe('place among the distinct times, from 0');
    expect(scan.remarks).toContainEqual(expect.stringContaining('no frame column: 3 frames are numbered from 0'));
  });

  it('works over several files, and without a header', async () => {
    const files = [memorySource('a.txt', '0.125 1 2\n0.25 3 4\n'), memorySource('b.txt', '0.25 5 6\n0.5 7 8\n')];
    const { scan, blocks } = await readDump(files, { timesAreClock: true });
    expect([...scan.frameCounts]).toEqual([1, 2, 1]);
    expect(flatRows(blocks).map(([frame, x]) => [frame, x])).toEqual([
      [0, 1],
      [1, 3],
      [1, 5],
      [2, 7],
    ]);
  });

  it('sets rows without a time aside', async () => {
    const { scan } = await readText(`${text}nan,40,4\n`, { timesAreClock: true });
    expect(scan.rowsRead).toBe(5);
    expect(scan.setAside).toMatchObject([{ reason: 'time-not-finite', count: 1 }]);
  });

  it('keeps a frame column where there is one, and a column "t" as frame numbers where times are no clock', async () => {
    const both = await readText('frame,t,x,y\n7,0.5,1,2\n9,0.75,1,2\n', { timesAreClock: true });
    expect([...both.scan.frameNumbers]).toEqual([7, 9]);
    const frames = await readText('t,x,y\n7,1,2\n9,1,2\n');
    expect([...frames.scan.frameNumbers]).toEqual([7, 9]);
    expect(frames.scan.has.time).toBe(false);
  });

  it('names the way where times stand in the frame column', async () => {
    await expect(readText(text)).rejects.toMatchObject({
      code: 'dump/too-many-bad-rows',
      message: expect.stringContaining('if the frame column holds times, add --times yes'),
    });
  });

  it('refuses a time a row within little memory', async () => {
    const many = Array.from({ length: 9000 }, (_, i) => `${i / 8},1,2`).join('\n');
    const few = readDump([memorySource('run.csv', `t,x,y\n${many}\n`)], { timesAreClock: true }, { ramLimit: 1000 });
    await expect(few).rejects.toMatchObject({ code: 'dump/order-needs-ram' });
  });

  it('is off where nobody asks for it', () => {
    expect(dumpSettings().timesAreClock).toBeUndefined();
  });
});

describe('a z column of one value', () => {
  it.each([
    ['in frame order', '0,1,2,0\n0,3,4,0\n1,1,2,0\n', 0],
    ['out of frame order', '1,1,2,-7.5\n0,1,2,-7.5\n0,3,4,-7.5\n', -7.5],
  ])('%s is a light sheet', async (_, rows, z) => {
    const { scan, blocks } = await readText(`frame,x,y,z\n${rows}`);
    expect(scan.dims).toBe(2);
    expect(scan.bounds.max[2]).toBeNaN();
    expect(scan.remarks).toContain(`z is ${z} in every row: taken as a light sheet, in the plane`);
    for (const block of blocks) expect([block.dims, block.z.length]).toEqual([2, 0]);
    expect(flatRows(blocks).map(([frame, x, y]) => [frame, x, y])).toEqual([
      [0, 1, 2],
      [0, 3, 4],
      [1, 1, 2],
    ]);
  });

  it('stays a volume as soon as one row differs', async () => {
    const { scan, blocks } = await readText('frame,x,y,z\n0,1,2,0\n0,3,4,0\n1,1,2,1e-9\n');
    expect(scan.dims).toBe(3);
    expect(flatRows(blocks).map(([, , , z]) => z)).toEqual([0, 0, 1e-9]);
  });
});

describe('rows that stand more than once', () => {
  const rows = Array.from({ length: 200 }, (_, i) => `${Math.floor(i / 10)},${i},${2 * i}`);
  const dump = (copies: number, extra: string[] = []) =>
    `frame,x,y\n${Array.from({ length: copies }, () => rows.join('\n')).join('\n')}\n${extra.join('\n')}\n`;

  it.each([
    ['twice', 2, 50],
    ['3 times', 3, 67],
  ])('all %s: says so, and what to do', async (words, copies, percent) => {
    const text = dump(copies);
    const message = await needFailure(readText(text, { badRowsLimit: 0.05 }), 'dump/too-many-bad-rows');
    expect(message).toContain(`every row stands ${words}, as when a file is written or given ${words}`);
    expect(message).toContain(`--bad-rows-limit ${percent}%`);
    expect(message).not.toContain('separator');
    const { scan } = await readText(text, { badRowsLimit: percent / 100 });
    expect(scan.rowsRead).toBe(200);
  });

  it('some: says so; other troubles keep their own advice', async () => {
    const some = await needFailure(
      readText(dump(1, rows.slice(0, 90)), { badRowsLimit: 0.05 }),
      'dump/too-many-bad-rows',
    );
    expect(some).toContain('rows stand more than once, as when a file is written or given twice');
    const other = await needFailure(
      readText(
        dump(
          1,
          rows.map(() => '1,nan,2'),
        ),
        { badRowsLimit: 0.05 },
      ),
      'dump/too-many-bad-rows',
    );
    expect(other).toContain('check separator, decimal mark and columns');
  });
});
