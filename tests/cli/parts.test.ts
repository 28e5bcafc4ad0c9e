import { mkdirSync, mkdtempSync, readdirSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { SETTING_TABLE } from '@wakeloom/tracker/run/options';
import { resolveRun } from '@wakeloom/tracker/run/resolve';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import { differencesFrom, type EarlierRecord } from '../../packages/cli/src/earlier-result.js';
import { expandFiles, naturalOrder, safeName } from '../../packages/cli/src/files.js';
import { summaryLines } from '../../packages/cli/src/messages.js';
import { readNormalisation } from '../../packages/cli/src/normalise.js';
import { joinValues, OPTION_ROWS } from '../../packages/cli/src/options.js';
import { prepareOutFolder } from '../../packages/cli/src/out-folder.js';
import { createProgress, progressWords } from '../../packages/cli/src/progress.js';
import { sampleRecord } from '../helpers/sample-run.js';

let folder: string;
beforeEach(() => {
  folder = mkdtempSync(join(tmpdir(), 'wakeloom-cli-'));
});
afterEach(() => rmSync(folder, { recursive: true, force: true }));

const put = (name: string, text = '') => {
  const path = join(folder, name);
  mkdirSync(join(path, '..'), { recursive: true });
  writeFileSync(path, text);
  return path;
};
const codeOf = (work: () => unknown): string => {
  try {
    work();
  } catch (error) {
    return (error as { code: string }).code;
  }
  return 'no error';
};

describe('files', () => {
  it('come in the order in which people count', () => {
    const names = ['f10.csv', 'f9.csv', 'f1.csv', 'f010b.csv', 'a.csv', 'f1a.csv', 'f01.csv'];
    expect([...names].sort(naturalOrder)).toEqual([
      'a.csv',
      'f01.csv',
      'f1.csv',
      'f1a.csv',
      'f9.csv',
      'f10.csv',
      'f010b.csv',
    ]);
    expect([...names].reverse().sort(naturalOrder)).toEqual([...names].sort(naturalOrder));
  });

  it('are found by patterns, in folders too, hidden ones left out', () => {
    for (const name of ['run/f2.csv', 'run/f10.csv', 'run/f1.txt', 'run/.f3.csv', 'run/deep/er/f4.csv']) put(name);
    const below = (pattern: string) =>
      expandFiles([join(folder, pattern)]).map((path) => path.slice(folder.length + 1));
    expect(below('run/*.csv')).toEqual(['run/f2.csv', 'run/f10.csv']);
    expect(below('run/f?.*')).toEqual(['run/f1.txt', 'run/f2.csv']);
    expect(below('run/f[!1].csv')).toEqual(['run/f2.csv']);
    expect(below('run/**/*.csv')).toEqual(['run/deep/er/f4.csv', 'run/f2.csv', 'run/f10.csv']);
    expect(expandFiles(['*.csv'], join(folder, 'run')).length).toBe(2);
  });

  it('a name that looks like a pattern but exists is that file', () => {
    const path = put('run[1].csv');
    expect(expandFiles([path])).toEqual([path]);
  });

  it('that are not there or are folders are refused, with what lies nearby', () => {
    put('cylinder.csv');
    expect(codeOf(() => expandFiles([join(folder, '*.npy')]))).toBe('usage/no-such-file');
    expect(codeOf(() => expandFiles([folder]))).toBe('usage/not-a-file');
    expect(() => expandFiles([join(folder, 'cylinder-1.csv')])).toThrow(/there is cylinder\.csv/);
    expect(() => expandFiles([join(folder, 'nowhere', 'a.csv')])).toThrow(/nowhere" does not exist/);
  });

  it('get names that Windows takes too', () => {
    expect(safeName('cylinder: 30 mm/s, "A"?')).toBe('cylinder- 30 mm-s, -A--');
    expect(safeName('con')).toBe('_con');
    expect(safeName('LPT1.txt')).toBe('_LPT1.txt');
    expect(safeName(' .. ')).toBe('run');
    expect(safeName('ends. ')).toBe('ends');
  });
});

describe('the out folder', () => {
  const prepare = (out: string, replace = false, differences: string[] = []) =>
    prepareOutFolder(out, replace, () => Promise.resolve(differences));
  const refusal = (out: string, replace = false, differences: string[] = []) =>
    prepare(out, replace, differences).then(
      () => 'no error',
      (error: { code: string }) => error.code,
    );

  it('is made when missing and left empty, and unmade when nothing came of the run', async () => {
    const out = join(folder, 'new', 'out');
    const { earlier, undo } = await prepare(out);
    expect(readdirSync(out)).toEqual([]);
    expect(earlier).toBeNull();
    undo();
    expect(readdirSync(folder)).toEqual([]);
  });

  it('is not unmade when it was there before or holds something', async () => {
    mkdirSync(join(folder, 'old'));
    (await prepare(join(folder, 'old'))).undo();
    const { undo } = await prepare(join(folder, 'new'));
    put('new/results-of-somebody');
    undo();
    expect(readdirSync(folder).sort()).toEqual(['new', 'old']);
  });

  it('may hold an earlier result, a run that was cut short, or what systems leave behind', async () => {
    const ours = JSON.stringify({ program: { name: 'wakeloom' } });
    put('done/run.json', ours);
    put('done/my-plot.png');
    put('cut/.partial-pathlines.nc');
    put('cut/grid.nc');
    put('plain/.DS_Store');
    for (const name of ['done', 'cut', 'plain']) expect(await refusal(join(folder, name))).toBe('no error');
  });

  it('with the result of another run is refused unless --replace', async () => {
    put('done/run.json', JSON.stringify({ program: { name: 'wakeloom' }, run: 'first' }));
    const out = join(folder, 'done');
    expect(await refusal(out, false, ['grid.bin'])).toBe('usage/out-other-run');
    await expect(prepare(out, false, ['grid.bin'])).rejects.toThrow(/another run, "first" \(differs in grid\.bin\)/);
    expect((await prepare(out, true, ['grid.bin'])).earlier?.run).toBe('first');
  });

  it('with other files is refused unless --replace, and then loses nothing', async () => {
    put('foreign/thesis.tex', 'years of work');
    put('fake/run.json', '{"program":{"name":"other"}}');
    put('fake/x.txt');
    expect(await refusal(join(folder, 'foreign'))).toBe('usage/out-not-empty');
    expect(await refusal(join(folder, 'fake'))).toBe('usage/out-not-empty');
    await prepare(join(folder, 'foreign'), true);
    expect(readdirSync(join(folder, 'foreign'))).toEqual(['thesis.tex']);
    expect(await refusal(join(folder, 'foreign', 'thesis.tex'), true)).toBe('usage/out-not-a-folder');
  });

  it('below a file is refused', async () => {
    expect(await refusal(join(put('file'), 'out'))).toBe('usage/out-not-writable');
  });
});

describe('a run over an earlier result', () => {
  const options = { rate: '60 Hz', scale: '0.05 mm/px' };
  const resolved = (more: Record<string, string> = {}) =>
    resolveRun({ options: { ...options, ...more }, dumpFiles: ['dump.csv'] });
  const record = (sha256: string): EarlierRecord => ({
    run: 'first',
    settings: resolved().records,
    inputs: [{ name: 'elsewhere/dump.csv', bytes: 5, modified: new Date(0).toISOString(), sha256 }],
  });
  // Of coreutils: printf 'a,b\nc' | sha256sum
  const SHA = '9352b95467bf40616cf74b44b11373df5bbeefd5b1b69f1d458451d6a1d7a0e9';

  it('is the same with the same bytes and settings, whatever threads and memory', async () => {
    const file = put('dump.csv', 'a,b\nc');
    expect(await differencesFrom(record(SHA), resolved({ threads: '2', 'ram-limit': '1 GB' }), [file])).toEqual([]);
  });

  it('differs by its settings', async () => {
    const file = put('dump.csv', 'a,b\nc');
    const run = resolved({ bin: '2 mm', rate: '50 Hz' });
    expect(await differencesFrom(record(SHA), run, [file])).toEqual(['clock.rate', 'grid.bin']);
  });

  it('differs by its detections: other bytes, another name, another number of files', async () => {
    const other = put('dump.csv', 'a,b\nd');
    expect(await differencesFrom(record(SHA), resolved(), [other])).toEqual(['other detections']);
    const renamed = put('dump-2.csv', 'a,b\nc');
    expect(await differencesFrom(record(SHA), resolved(), [renamed])).toEqual(['other detections']);
    expect(await differencesFrom(record(SHA), resolved(), [other, other])).toEqual(['other detections']);
  });
});

describe('options', () => {
  it('offer every setting of the table but files, without clashing with those of the verbs', () => {
    const left = SETTING_TABLE.filter((row) => !OPTION_ROWS.includes(row)).map(({ key }) => key);
    expect(left).toEqual(['dump.files']);
    const names = OPTION_ROWS.map(({ option }) => option);
    expect(new Set(names).size).toBe(names.length);
    for (const own of ['out', 'replace', 'quiet', 'help', 'version', 'format', 'normalise', 'verify'])
      expect(names).not.toContain(own);
  });

  it('may have values that start with a minus sign', () => {
    const values = new Set(['origin', 'out']);
    expect(joinValues(['a.csv', '--origin', '-5, 3 px', '--quiet', '--out', 'd'], values)).toEqual([
      'a.csv',
      '--origin=-5, 3 px',
      '--quiet',
      '--out=d',
    ]);
    expect(joinValues(['--origin', '--quiet'], values)).toEqual(['--origin', '--quiet']);
    expect(joinValues(['--', '--origin', '1'], values)).toEqual(['--', '--origin', '1']);
  });
});

describe('normalisation', () => {
  const units = { length: 'mm', time: 's' };
  it('takes a length and a speed in any unit that converts', () => {
    expect(readNormalisation('5 mm, 30 mm/s', units)).toEqual({ length: 5, speed: 30 });
    const metres = readNormalisation('0.005 m, 0.03 m/s', units);
    expect(metres.length).toBeCloseTo(5, 12);
    expect(metres.speed).toBeCloseTo(30, 12);
  });
  it.each([
    '5 mm',
    '5 mm, 30',
    '5, 30 mm/s',
    '0 mm, 30 mm/s',
    '5 mm, -3 mm/s',
    '5 mm, 30 mm',
    '',
    '1 mm, 1 mm/s, 1 mm',
  ])('refuses "%s"', (text) => {
    expect(codeOf(() => readNormalisation(text, units))).toBe('usage/normalise');
  });
});

/** A terminal that notes what it is told. */
function noted(redraws: boolean, columns = 80) {
  const lines: string[] = [];
  const drawn: string[] = [];
  return {
    lines,
    drawn,
    redraws,
    columns,
    say: (line: string) => void lines.push(line),
    draw: (text: string) => void drawn.push(text),
  };
}

describe('progress', () => {
  it('says how far, how fast and how long still', () => {
    const state = { stage: 'link', done: 300, total: 600, unit: 'frames', rate: 150, seconds: 2 };
    expect(progressWords(state)).toBe('link: 300 of 600 frames, 50 %, 150 frames/s, 2.0 s left');
    expect(progressWords({ ...state, total: null })).toBe('link: 300 frames, 150 frames/s');
    expect(progressWords({ ...state, seconds: 0.5 })).toBe('link: 300 of 600 frames, 50 %');
    expect(progressWords({ ...state, unit: 'bytes', done: 3e6, total: 12e6, rate: 1e6 })).toBe(
      'link: 3 MB of 12 MB, 25 %, 1 MB/s, 9.0 s left',
    );
  });

  it('redraws one line on a terminal, never wider than it, and clears it before other words', () => {
    let time = 0;
    const terminal = noted(true, 50);
    const progress = createProgress(terminal, { quiet: false, now: () => time });
    for (let done = 0; done <= 600; done++) {
      time += 10;
      progress.update('link', done, 600, 'frames');
    }
    expect(terminal.drawn.length).toBeGreaterThan(50);
    expect(terminal.drawn.length).toBeLessThan(70);
    for (const text of terminal.drawn) expect(text).toMatch(/^\r[ -~]{0,50}$/);
    progress.say('warning something');
    expect(terminal.drawn.at(-1)).toMatch(/^\r +\r$/);
    expect(terminal.lines).toEqual(['warning something']);
    const before = terminal.drawn.length;
    progress.end();
    expect(terminal.drawn.length).toBe(before);
  });

  it('elsewhere says a plain line now and then, and nothing in a short run', () => {
    let time = 0;
    const terminal = noted(false);
    const progress = createProgress(terminal, { quiet: false, now: () => time });
    for (let second = 0; second <= 160; second++) {
      time = second * 1000;
      progress.update('link', second, 200, 'frames');
    }
    progress.end();
    expect(terminal.drawn).toEqual([]);
    expect(terminal.lines.map((line) => line.split(' of ')[0])).toEqual([
      'link: 10',
      'link: 20',
      'link: 40',
      'link: 100',
      'link: 160',
    ]);
  });

  it('says nothing when quiet', () => {
    const terminal = noted(true);
    const progress = createProgress(terminal, { quiet: true });
    progress.update('link', 1, 2, 'frames');
    progress.end();
    expect([...terminal.lines, ...terminal.drawn]).toEqual([]);
  });
});

describe('the summary', () => {
  const lines = summaryLines(sampleRecord());
  const text = lines.join('\n');

  it('gives counts at each step and key figures with units, in plain ASCII', () => {
    expect(text).toMatch(/^Rows in the dump +1 200 012$/m);
    expect(text).toMatch(/^ {2}rows set aside +5 {2}< 0\.01 % of rows$/m);
    expect(text).toMatch(/^Detections +1 200 007$/m);
    expect(text).toMatch(/^Links +1 050 000$/m);
    expect(text).toMatch(/^Pathlines +21 500$/m);
    expect(text).toMatch(/^Samples +1 071 500 /m);
    expect(text).toMatch(/^ {2}flagged off-fit +900 {2}0\.084 % of samples$/m);
    expect(text).toMatch(/^Mean speed +28\.31 mm\/s /m);
    expect(text).toMatch(/^Peak speed +47\.90 mm\/s /m);
    expect(text).toMatch(/^Position noise +0\.0051, 0\.0049 mm /m);
    expect(text).toMatch(/^Displacement ratio +0\.391 .*95th percentile 0\.553$/m);
    expect(text).toMatch(/^assumed: The density/m);
    expect(text).toMatch(/^warning: Frame 214/m);
    // biome-ignore lint/suspicious/noControlCharactersInRegex: the test is for characters outside ASCII.
    expect(text).toMatch(/^[\u0000-\u007e]*$/);
  });

  it('leaves out inner steps that took nothing away', () => {
    expect(text).not.toContain('flagged stuck');
  });
});
