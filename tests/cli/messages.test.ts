import { existsSync, mkdirSync, mkdtempSync, readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import type { RunRecord } from '@wakeloom/tracker/store/run-record';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { runCli } from '../helpers/run-cli.js';
import { vortexDump } from '../helpers/vortex-dump.js';

const folder = mkdtempSync(join(tmpdir(), 'wakeloom-messages-'));
const at = (...parts: string[]) => join(folder, ...parts);
afterAll(() => rmSync(folder, { recursive: true, force: true }));
const process = (...words: string[]) => runCli(['process', ...words], { cwd: folder });
const recordOf = (out: string) => JSON.parse(readFileSync(at(out, 'run.json'), 'utf8')) as RunRecord;
const count = (text: string, part: string) => text.split(part).length - 1;

/** Frame, x and y of a steady vortex, rows in frame order. */
let rows: string[];

beforeAll(async () => {
  const text = new TextDecoder().decode(await vortexDump(12, 300));
  // Without the brightness that stands in the fourth column.
  rows = text
    .trimEnd()
    .split('\n')
    .slice(1)
    .map((row) => row.split(',').slice(0, 3).join(','));
  writeFileSync(at('plain.csv'), text);
  const odd = rows.map((row, i) => `${row},${i % 7}`);
  odd.splice(40, 0, '0,inf,5,1', '0,x,5,1');
  // Frames 5 and 6 are missing: a remark of the reader.
  const kept = odd.filter((row) => !/^[56],/.test(row));
  writeFileSync(at('odd.csv'), ['frame,x,y,track', ...kept].join('\n'));
});

describe('a run with things to tell', () => {
  let stderr: string;
  let stdout: string;
  beforeAll(async () => {
    const result = await process('odd.csv', '--rate', '100 Hz', '--scale', '0.05 mm/px', '--out', 'odd');
    expect([result.code, result.code === 0 ? '' : result.stderr]).toEqual([0, '']);
    ({ stderr, stdout } = result);
  });

  it('says each note and warning once', () => {
    expect(count(stderr, 'frame numbers without any detection')).toBe(1);
    expect(count(stderr, 'rows set aside: not-finite')).toBe(1);
    expect(count(stderr, 'rows set aside: not-a-number')).toBe(1);
    expect(stdout).not.toContain('rows set aside: not');
    const lines = stderr.trimEnd().split('\n');
    expect(new Set(lines).size).toBe(lines.length);
  });

  it('does not put words into the dump: an infinite value is called so', () => {
    expect(stderr).toMatch(/odd\.csv line 42: x is infinite/);
    expect(stderr).not.toContain('Infinity');
  });

  it('tells that pathline numbers lie there unused, and how to use them', () => {
    expect(stderr).toMatch(
      /note the dump carries pathline numbers \(.*"track"\), which are ignored.*--pathline-numbers/,
    );
  });

  it('logs start, inputs, scan, first look, rows set aside, stream, files and end, in order of time', () => {
    const log = readFileSync(at('odd', 'log.ndjson'), 'utf8')
      .trimEnd()
      .split('\n')
      .map((line) => JSON.parse(line) as { code: string; seconds: number; level: string; message: string });
    const codes = log.map(({ code }) => code);
    expect(codes[0]).toBe('run/started');
    expect(codes.at(-1)).toBe('run/finished');
    for (const code of ['dump/inputs', 'run/scanned', 'linking/first-look', 'run/streamed', 'run/written']) {
      expect(count(codes.join(' '), code), code).toBe(1);
    }
    expect(codes.filter((code) => code === 'dump/row-set-aside')).toHaveLength(2);
    for (let k = 1; k < log.length; k++) expect(log[k]!.seconds).toBeGreaterThanOrEqual(log[k - 1]!.seconds);
    const record = recordOf('odd');
    expect(log.filter(({ level }) => level === 'warning').map(({ message }) => message)).toEqual(record.warnings);
    expect(log.find(({ code }) => code === 'run/written')!.message).toContain(`${record.counts.pathlines} pathlines`);
  });

  it('records durations that add up to the run', () => {
    const { started, finished, seconds } = recordOf('odd').clockTimes;
    expect(Object.keys(seconds).sort()).toEqual(['look', 'scan', 'stream', 'total', 'write']);
    const { total, ...parts } = seconds as Record<string, number>;
    const sum = Object.values(parts).reduce((a, b) => a + b, 0);
    for (const part of Object.values(parts)) expect(part).toBeGreaterThan(1e-4);
    // What lies between the parts is the opening of files: next to nothing.
    expect(sum).toBeLessThanOrEqual(total!);
    expect(sum).toBeGreaterThan(0.8 * total!);
    // Two clocks, one of them in whole milliseconds.
    expect(Math.abs((Date.parse(finished) - Date.parse(started)) / 1000 - total!)).toBeLessThan(0.05);
  });
});

describe('what is wrong with columns and files', () => {
  it.each<[string, string[], RegExp]>([
    ['a column that is not there', ['plain.csv', '--x-column', 'foo'], /no such column for x: got the name "foo"/],
    [
      'pathline numbers that are not there',
      ['plain.csv', '--pathline-numbers', 'keep'],
      /no column of pathline numbers/,
    ],
  ])('%s is wrong usage: exit 2, and no folder is left', async (_, words, message) => {
    const { code, stdout, stderr } = await process(...words, '--out', join('none', 'deep'));
    expect([code, stdout]).toEqual([2, '']);
    expect(stderr).toMatch(message);
    expect(existsSync(at('none'))).toBe(false);
  });

  it('one frame only is said to be one', async () => {
    writeFileSync(at('one.csv'), 'frame,x,y\n7,1,2\n7,3,4\n7,5,6\n');
    const { code, stderr } = await process('one.csv', '--out', 'none');
    expect(code).toBe(1);
    expect(stderr).toMatch(/got one frame only \(number 7, 3 detections\)/);
  });

  it('rows out of order beyond the limit are told with both figures and the rule, and the limit named suffices', async () => {
    // 28 bytes a row and more: 32 MB hold no 600 000 rows in a half.
    const text = Array.from({ length: 600_000 }, (_, i) => `${600_000 - (i >> 3)},${i % 997},${i % 499}`);
    writeFileSync(at('shuffled.csv'), `frame,x,y\n${text.join('\n')}\n`);
    const { code, stderr } = await process('shuffled.csv', '--ram-limit', '32 MB', '--out', 'none');
    expect(code).toBe(1);
    const [, need, most, give] = /need (\d+) MB .* at most (\d+) MB, half of the RAM limit; give --ram-limit "(\d+) MB"/
      .exec(stderr)!
      .map(Number);
    expect(most).toBe(16);
    expect(need).toBeGreaterThan(16);
    expect(give! / 2).toBeGreaterThanOrEqual(need! - 1);
    rmSync(at('shuffled.csv'));
  });

  it('a limit too small for anything is refused with the reason', async () => {
    const { code, stderr } = await process('plain.csv', '--ram-limit', '1 MB', '--out', 'none');
    expect(code).toBe(2);
    expect(stderr).toMatch(
      /--ram-limit: got 1 MB, expected at least 32 MB: half of it holds .* about 180 MB beside it/,
    );
  });
});

describe('one file a frame', () => {
  beforeAll(() => {
    mkdirSync(at('frames'));
    for (let frame = 0; frame < 12; frame++) {
      const own = rows.filter((row) => row.startsWith(`${frame},`)).map((row) => row.replace(/^\d+,/, ''));
      writeFileSync(at('frames', `f${frame}.csv`), `x,y\n${own.join('\n')}\n`);
    }
  });

  it('without --layout is refused with a word on it', async () => {
    const { code, stderr } = await process(join('frames', '*.csv'), '--out', 'none');
    expect(code).toBe(2);
    expect(stderr).toMatch(/no column for frame.*\(12 files were given\) add --layout frame-from-name/);
  });

  it('as a pattern goes by the numbers and is named after its folder', async () => {
    const { code } = await process(
      join('frames', '*.csv'),
      '--layout',
      'frame-from-order',
      '--out',
      'sorted',
      '--quiet',
    );
    expect(code).toBe(0);
    const record = recordOf('sorted');
    expect(record.run).toBe('frames');
    expect(record.inputs.map(({ name }) => name)).toEqual(
      Array.from({ length: 12 }, (_, frame) => join('frames', `f${frame}.csv`)),
    );
  });

  it('as a list goes in the order given, with a note where the names count otherwise', async () => {
    const given = [0, 1, 10, 11, 2, 3, 4, 5, 6, 7, 8, 9].map((frame) => join('frames', `f${frame}.csv`));
    const { code, stderr } = await process(...given, '--layout', 'frame-from-order', '--out', 'listed');
    expect(code).toBe(0);
    expect(stderr).toMatch(/note files are taken in the order given.*f11\.csv before .*f2\.csv/);
    expect(recordOf('listed').inputs.map(({ name }) => name)).toEqual(given);
    expect(readdirSync(at('listed'))).toContain('run.json');
  });
});
