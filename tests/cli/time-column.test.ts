import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { resolveRun } from '@wakeloom/tracker/run/resolve';
import { afterAll, describe, expect, it } from 'vitest';
import { joinValues } from '../../packages/cli/src/options.js';
import { runCli } from '../helpers/run-cli.js';

const folder = mkdtempSync(join(tmpdir(), 'wakeloom-times-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));

/** 30 particles in 24 frames at 50 Hz on a lattice of 40 px, all moving by 2 px a frame along x. */
function rows(line: (frame: number, x: number, y: number) => string): string {
  const lines: string[] = [];
  for (let k = 0; k < 24; k++) {
    for (let p = 0; p < 30; p++) lines.push(line(k, 40 * (p % 6) + 2 * k, 40 * Math.floor(p / 6)));
  }
  return `${lines.join('\n')}\n`;
}

async function processed(name: string, text: string, options: string[]) {
  const dump = join(folder, `${name}.csv`);
  const out = join(folder, name);
  writeFileSync(dump, text);
  const done = await runCli(['process', ...options, dump, '--bin', '40 px', '--out', out]);
  expect(done).toMatchObject({ code: 0 });
  return { ...done, record: JSON.parse(readFileSync(join(out, 'run.json'), 'utf8')) };
}

describe('--times', () => {
  it('means yes without its word, and never takes the dump for one', () => {
    expect(joinValues(['--times', 'a.csv'], new Set(['times']))).toEqual(['--times=yes', 'a.csv']);
    expect(joinValues(['a.csv', '--times'], new Set(['times']))).toEqual(['a.csv', '--times=yes']);
    expect(joinValues(['--times', 'no', 'a.csv'], new Set(['times']))).toEqual(['--times=no', 'a.csv']);
    expect(joinValues(['--times', '--quiet'], new Set(['times']))).toEqual(['--times=yes', '--quiet']);
  });

  it('tells the dump that times are the clock', () => {
    expect(resolveRun({ options: { times: 'yes' }, dumpFiles: ['a.csv'] }).settings.dump.timesAreClock).toBe(true);
    const named = resolveRun({ options: { 'time-column': 't' }, dumpFiles: ['a.csv'] });
    expect(named.settings.dump.timesAreClock).toBe(true);
    const rated = resolveRun({ options: { 'time-column': 't', rate: '50 Hz' }, dumpFiles: ['a.csv'] });
    expect(rated.settings.dump.timesAreClock).toBe(false);
  });

  it('makes frames and velocities of a dump with nothing but t, x, y', { timeout: 60_000 }, async () => {
    const text = `t,x,y\n${rows((k, x, y) => `${k / 50},${x},${y}`)}`;
    const { stderr, record } = await processed('only-t', text, ['--times']);
    // 2 px in 1/50 s.
    expect(record.figures.meanSpeed).toBeCloseTo(100, 6);
    expect(record.counts).toMatchObject({ framesPresent: 24, pathlines: 30 });
    expect(stderr.match(/no frame column: 24 frames are numbered/g)).toHaveLength(1);
    expect(record.columns.frame).toBe('place among the distinct times, from 0');
  });
});

describe('a time column nobody asked for', () => {
  const text = `frame,t,x,y,z\n${rows((k, x, y) => `${k},${k / 50},${x},${y},0`)}`;

  it('is noted without a rate; a z of zeros everywhere is a light sheet', { timeout: 60_000 }, async () => {
    const { stderr, record } = await processed('none', text, []);
    expect(stderr).toMatch(/^note column "t" found, not used as the clock; add --times yes/m);
    expect(record.figures.meanSpeed).toBeCloseTo(2, 6);
    expect(stderr).toMatch(/^note z is 0 in every row/m);
    expect([record.figures.noise, record.prior.noise, record.prior.reach].map(({ length }) => length)).toEqual([
      2, 2, 2,
    ]);
  });

  it('is held against a rate, with both figures', { timeout: 60_000 }, async () => {
    const { record } = await processed('rate', text, ['--rate', '60 Hz']);
    expect(record.warnings).toContainEqual(
      expect.stringMatching(/got 0\.02 s a frame in column "t", expected 0\.0166667 s at 60 Hz \(\+20 %\)/),
    );
    const right = await processed('right', text, ['--rate', '50 Hz']);
    expect(right.record.warnings.filter((line: string) => line.includes('disagree'))).toEqual([]);
  });
});
