import { cpSync, existsSync, mkdtempSync, readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { runCli } from '../helpers/run-cli.js';

let folder: string;
const at = (...parts: string[]) => join(folder, ...parts);

/** Park & Miller's generator (Comm. ACM 31, 1988, 1192; multiplier 48271): evenly spread figures in 0..1. */
function* draws(): Generator<number, never> {
  for (let state = 12345; ; ) {
    state = (state * 48271) % 2147483647;
    yield state / 2147483647;
  }
}

/**
 * 300 particles at random places in a uniform stream of 2 px along x and 0.5 px along y a frame, 24 frames, with
 * position noise of 0.06 px (standard deviation of an even spread over 0.2 px).
 */
function streamCsv(): string {
  const random = draws();
  const draw = () => random.next().value;
  const places = Array.from({ length: 300 }, () => [600 * draw(), 450 * draw()] as const);
  const lines = ['frame,x,y'];
  for (let frame = 0; frame < 24; frame++) {
    for (const [x, y] of places) {
      lines.push(
        `${frame},${(x + 2 * frame + 0.2 * draw()).toFixed(3)},${(y + 0.5 * frame + 0.2 * draw()).toFixed(3)}`,
      );
    }
  }
  return `${lines.join('\n')}\n`;
}

beforeAll(() => {
  folder = mkdtempSync(join(tmpdir(), 'wakeloom-commands-'));
  writeFileSync(at('stream.csv'), streamCsv());
});
afterAll(() => rmSync(folder, { recursive: true, force: true }));

describe('help', () => {
  it.each([
    ['overview', ['--help']],
    ['process', ['process', '--help']],
    ['export', ['export', '--help']],
    ['demo', ['demo', '--help']],
  ])('of %s is as kept in golden/', async (name, words) => {
    const { code, stdout, stderr } = await runCli(words);
    expect([code, stderr]).toEqual([0, '']);
    await expect(stdout).toMatchFileSnapshot(`golden/help-${name}.txt`);
  });

  it('is the same for "help VERB", and without a verb goes to stderr with exit 2', async () => {
    const [direct, through, none] = await Promise.all([
      runCli(['export', '--help']),
      runCli(['help', 'export']),
      runCli([]),
    ]);
    expect(through.stdout).toBe(direct.stdout);
    expect([none.code, none.stdout]).toEqual([2, '']);
    expect(none.stderr).toContain('wakeloom VERB');
  });

  it('names no verb that does not exist', async () => {
    const { stdout } = await runCli(['--help']);
    const verbs = [...stdout.matchAll(/^ {2}([a-z]+) {2,}/gm)].map(([, verb]) => verb!);
    expect(verbs).toEqual(['process', 'export', 'demo']);
    for (const verb of verbs) expect((await runCli([verb, '--help'])).code).toBe(0);
  });
});

describe('wrong usage exits 2, says what was got and expected, and starts nothing', () => {
  it.each<[string[], RegExp]>([
    [['proces'], /got "proces", expected one of process, export, demo; nearest is process/],
    [
      ['process', 'stream.csv', '--reech', '3', '--out', 'o'],
      /--reech: got an option that does not exist.*nearest is --reach/,
    ],
    [['process', 'stream.csv', '--reach', '--out', 'o'], /--reach: got no value/],
    [['process', 'stream.csv', '--rate', '60 Hz', '--rate', '61 Hz', '--out', 'o'], /--rate: got 2 values/],
    [['process', 'stream.csv', '--rate', '60 mm', '--out', 'o'], /--rate: got "60 mm", expected a frequency/],
    [['process', 'stream.csv', '--rate', '60', '--out', 'o'], /--rate: got "60", .*unit/],
    [['process', 'stream.csv'], /--out: got nothing/],
    [['process', '--out', 'o'], /got no input/],
    [['process', 'steam.csv', '--out', 'o'], /got "steam.csv", which does not exist/],
    [['process', '*.npy', '--out', 'o'], /pattern "\*\.npy", which fits no file/],
    [['process', '.', '--out', 'o'], /which is a folder/],
    [['process', 'stream.csv', '--out', 'stream.csv'], /--out: got "stream.csv", which is a file/],
    [['process', 'stream.csv', '--out', '.'], /--out: got "\.", which holds other files \(stream\.csv/],
    [['export', 'nowhere', 'grid'], /got "nowhere", which is no folder/],
    [['export', '.', 'grid'], /holds no readable run\.json/],
    [['export', '.', 'fields'], /got "fields" after the folder, expected pathlines or grid/],
    [['export', '.', 'grid', '--format', 'xls'], /got "xls", expected one of csv/],
    [['demo', 'vortex'], /got "vortex", expected one of cylinder-wake, swirl/],
    [['demo', 'swirl', '--frames', '2.5'], /--frames: got "2.5", expected a whole number/],
  ])('%j', async (words, message) => {
    const { code, stdout, stderr } = await runCli(words, { cwd: folder });
    expect(stderr).toMatch(message);
    expect([code, stdout]).toEqual([2, '']);
    expect(stderr).not.toMatch(/^\s+at /m);
    expect(existsSync(at('o'))).toBe(false);
  });

  it('a wrong run sheet is named with line and column', async () => {
    writeFileSync(at('wrong.yaml'), 'run: test\ndump: { files: stream.csv }\nlinking: { reech: 3 mm }\n');
    const { code, stderr } = await runCli(['process', 'wrong.yaml', '--out', 'o'], { cwd: folder });
    expect(code).toBe(2);
    expect(stderr).toMatch(/wrong\.yaml:3:\d+: .*reech/);
  });
});

describe('process without a run sheet, then export', () => {
  const words = ['process', 'stream.csv', '--rate', '500 Hz', '--scale', '0.05 mm/px', '--bin', '2 mm'];

  it('writes the result folder and sums up on stdout', async () => {
    const { code, stdout, stderr } = await runCli([...words, '--out', 'result'], { cwd: folder });
    expect([code, stderr]).toEqual([0, '']);
    expect(readdirSync(at('result')).sort()).toEqual([
      'frames.nc',
      'grid.nc',
      'log.ndjson',
      'pathlines.nc',
      'report.html',
      'run.json',
    ]);
    expect(stdout).toMatch(/^Detections +7200$/m);
    expect(stdout).toMatch(/^Pathlines +300$/m);
    expect(stdout).toMatch(/^Samples +7200 /m);
    // sqrt(2^2 + 0.5^2) px a frame, 0.05 mm/px, 500 Hz: 51.54 mm/s.
    expect(stdout).toMatch(/^Mean speed +51\.5\d mm\/s/m);
    expect(stdout).toContain('assumed: y as written in the dump counts as up.');
    expect(stdout).toContain('Results in result');
    expect(stdout).not.toMatch(/NaN|undefined/);
    expect(stdout).not.toContain('\u001b');
  });

  it('takes its own result for an old one and replaces it; quietly when asked', async () => {
    const before = JSON.parse(readFileSync(at('result', 'run.json'), 'utf8')) as { digest: { content: string } };
    const { code, stdout, stderr } = await runCli([...words, '--out', 'result', '--quiet'], { cwd: folder });
    expect([code, stdout, stderr]).toEqual([0, '', '']);
    const after = JSON.parse(readFileSync(at('result', 'run.json'), 'utf8')) as { digest: { content: string } };
    expect(after.digest.content).toBe(before.digest.content);
  });

  it('says whose result it replaces, and refuses to without --replace when it is another run', async () => {
    const again = await runCli([...words, '--out', 'result'], { cwd: folder });
    expect([again.code, again.stderr]).toEqual([
      0,
      'note replaces the result of run stream once the new one is whole\n',
    ]);
    const before = readFileSync(at('result', 'run.json'), 'utf8');
    const other = await runCli([...words, '--span', '9', '--out', 'result'], { cwd: folder });
    expect([other.code, other.stdout]).toEqual([2, '']);
    expect(other.stderr).toMatch(/result of another run, "stream" \(differs in smoothing\.span\).*--replace/);
    expect(readFileSync(at('result', 'run.json'), 'utf8')).toBe(before);
  });

  it('gives the same from a run sheet whose paths count from the sheet', async () => {
    writeFileSync(
      at('sheet.yaml'),
      'dump: { files: stream.csv }\nclock: { rate: 500 Hz }\ngeometry: { scale: 0.05 mm/px }\ngrid: { bin: 2 mm }\n',
    );
    const { code } = await runCli(['process', at('sheet.yaml'), '--out', at('by-sheet'), '--quiet'], { cwd: tmpdir() });
    expect(code).toBe(0);
    const [one, two] = ['result', 'by-sheet'].map((name) => readFileSync(at(name, 'run.json'), 'utf8'));
    const digest = (text: string) =>
      (JSON.parse(text) as { digest: { files: Record<string, string> } }).digest.files['pathlines.nc'];
    expect(digest(two!)).toBe(digest(one!));
  });

  it('exports pathlines to stdout under the promised header, one row a sample', async () => {
    const { code, stdout, stderr } = await runCli(['export', 'result', 'pathlines', '--format', 'csv'], {
      cwd: folder,
    });
    expect(code).toBe(0);
    const [header, first, ...rest] = stdout.trimEnd().split('\n');
    expect(header!.split(',').slice(0, 13).join(',')).toBe('pathline,frame,detection,t,x,y,u,v,ax,ay,u_se,v_se,flags');
    expect(rest.length + 1).toBe(7200);
    expect(stderr).toMatch(/^7200 rows of \d+ columns/);
    const [pathline, frame, detection, t, x, y, u, v, , , uSe, vSe] = first!.split(',').map(Number);
    expect([pathline, frame, t]).toEqual([0, 0, 0]);
    // The detection is the 0-based data row of the dump: its position there, times the scale, is this one.
    const [, dumpX, dumpY] = readFileSync(at('stream.csv'), 'utf8').split('\n')[detection! + 1]!.split(',').map(Number);
    // Fitted and measured place differ by no more than the noise, 0.1 px or 0.005 mm at most about its middle.
    expect(Math.abs(x! - dumpX! * 0.05)).toBeLessThan(0.01);
    expect(Math.abs(y! - dumpY! * 0.05)).toBeLessThan(0.01);
    // 2 and 0.5 px a frame, 0.05 mm/px, 500 Hz; five standard errors as the row itself gives them.
    expect(Math.abs(u! - 50)).toBeLessThan(5 * uSe!);
    expect(Math.abs(v! - 12.5)).toBeLessThan(5 * vSe!);
  });

  it('exports the grid under the promised header, normalised when asked', async () => {
    const [plain, normalised] = await Promise.all([
      runCli(['export', 'result', 'grid'], { cwd: folder }),
      runCli(['export', 'result', 'grid', '--normalise', '5 mm, 0.05 m/s', '--quiet'], { cwd: folder }),
    ]);
    expect([plain.code, normalised.code, normalised.stderr]).toEqual([0, 0, '']);
    const columns = 'x,y,samples,pathlines,u,v,u_se,v_se,uu,uv,vv';
    const rows = plain.stdout.trimEnd().split('\n');
    expect(rows[0]!.startsWith(columns)).toBe(true);
    const other = normalised.stdout.trimEnd().split('\n');
    expect(other[0]).toBe(rows[0]);
    expect(other.length).toBe(rows.length);
    const filled = rows.findIndex((row, i) => i > 0 && row.split(',')[4] !== '');
    const [a, b] = [rows[filled]!, other[filled]!].map((row) => row.split(',').map(Number));
    expect(b![0]! * 5).toBeCloseTo(a![0]!, 6);
    expect(b![4]! * 50).toBeCloseTo(a![4]!, 3);
  });

  it.each([
    ['pathlines', 'parquet', '.parquet', 'PAR1'],
    ['pathlines', 'npy', '.npy', '\u0093NUMPY'],
    ['pathlines', 'vtk', '.vtp', '<?xml'],
    ['grid', 'vtk', '.vti', '<?xml'],
  ])('exports %s as %s into a file, and leaves no part of one behind', async (what, format, extension, magic) => {
    const out = `out-${what}${extension}`;
    const { code, stdout } = await runCli(['export', 'result', what, '--format', format, '--out', out], {
      cwd: folder,
    });
    expect([code, stdout]).toEqual([0, '']);
    expect(readFileSync(at(out)).subarray(0, magic.length).toString('latin1')).toBe(magic);
    expect(readdirSync(folder).filter((name) => name.includes('partial'))).toEqual([]);
  });

  it('ends quietly when whoever reads it has seen enough', async () => {
    const { code, stdout, stderr } = await runCli(['export', 'result', 'pathlines'], {
      cwd: folder,
      stopReading: true,
    });
    expect([code, stderr]).toEqual([0, '']);
    expect(stdout.startsWith('pathline,')).toBe(true);
    // Far less than the whole: 7200 rows of at least 100 characters.
    expect(stdout.length).toBeLessThan(7200 * 100);
  });

  it.each<[string, string[], RegExp]>([
    ['a file of the result itself', ['--out', join('result', 'grid.nc')], /lies in the result folder/],
    [
      'the same, whatever --replace says',
      ['--out', join('result', 'run.json'), '--replace'],
      /lies in the result folder/,
    ],
    ['a new file in the result folder', ['--out', join('result', 'grid.csv')], /lies in the result folder/],
    ['an existing file', ['--out', 'kept.txt'], /"kept\.txt", which exists.*--replace/],
    ['the legacy VTK ending', ['--format', 'vtk', '--out', 'grid.vtk'], /"grid\.vtk", expected \.vti/],
    ['the ending of polylines for a grid', ['--format', 'vtk', '--out', 'grid.vtp'], /expected \.vti/],
    ['a VTK ending for CSV', ['--out', 'grid.vti'], /expected \.csv for csv; or add --format vtk/],
  ])('does not write %s', async (_, more, message) => {
    writeFileSync(at('kept.txt'), 'years of work');
    const before = ['grid.nc', 'run.json'].map((name) => readFileSync(at('result', name), 'latin1'));
    const { code, stdout, stderr } = await runCli(['export', 'result', 'grid', ...more], { cwd: folder });
    expect([code, stdout]).toEqual([2, '']);
    expect(stderr).toMatch(message);
    expect(['grid.nc', 'run.json'].map((name) => readFileSync(at('result', name), 'latin1'))).toEqual(before);
    expect(readFileSync(at('kept.txt'), 'utf8')).toBe('years of work');
    expect(readdirSync(at('result'))).toHaveLength(6);
    expect(existsSync(at('grid.vtk'))).toBe(false);
  });

  it('writes over an existing file with --replace', async () => {
    writeFileSync(at('kept.txt'), 'old');
    const words = ['export', 'result', 'grid', '--out', 'kept.txt', '--replace', '--quiet'];
    expect((await runCli(words, { cwd: folder })).code).toBe(0);
    expect(readFileSync(at('kept.txt'), 'utf8')).toMatch(/^x,y,samples/);
  });

  it('--verify passes a whole result and finds one flipped bit', async () => {
    const words = ['export', 'damaged', 'grid', '--verify', '--out', 'verified.csv'];
    cpSync(at('result'), at('damaged'), { recursive: true });
    const whole = await runCli(words, { cwd: folder });
    expect(whole.code).toBe(0);
    rmSync(at('verified.csv'));
    const bytes = readFileSync(at('damaged', 'pathlines.nc'));
    // The time of a sample: a multiple of 1/500 s that stands in the raw data as it is.
    const place = bytes.lastIndexOf(Buffer.from(Float64Array.of(7 / 500).buffer));
    expect(place).toBeGreaterThan(0);
    bytes[place]! ^= 1;
    writeFileSync(at('damaged', 'pathlines.nc'), bytes);
    const broken = await runCli(words, { cwd: folder });
    expect([broken.code, broken.stdout]).toEqual([1, '']);
    expect(broken.stderr).toMatch(/got content .*, expected .* as run\.json says \(damaged\/pathlines\.nc\)/);
    expect(existsSync(at('verified.csv'))).toBe(false);
  });

  it('refuses to send anything but CSV to stdout', async () => {
    const { code, stdout, stderr } = await runCli(['export', 'result', 'grid', '--format', 'vtk'], { cwd: folder });
    expect([code, stdout]).toEqual([2, '']);
    expect(stderr).toContain('--out grid.vti');
  });
});

describe('failures exit 1 with a message, not a stack trace', () => {
  it.each([
    ['empty.csv', '', /empty/i],
    ['text.csv', 'frame,x,y\na,b,c\nd,e,f\n', /rows/],
  ])('%s', async (name, text, message) => {
    writeFileSync(at(name), text);
    const { code, stdout, stderr } = await runCli(['process', name, '--out', `failed-${name}`], { cwd: folder });
    expect([code, stdout]).toEqual([1, '']);
    expect(stderr).toMatch(message);
    expect(stderr).not.toMatch(/^\s+at /m);
    expect(existsSync(at(`failed-${name}`, 'run.json'))).toBe(false);
  });

  it('unless WAKELOOM_DEBUG=1 asks for it', async () => {
    const { stderr } = await runCli(['process', 'empty.csv', '--out', 'failed-debug'], {
      cwd: folder,
      env: { WAKELOOM_DEBUG: '1' },
    });
    expect(stderr).toMatch(/code dump\//);
    expect(stderr).toMatch(/^\s+at /m);
  });
});

describe('the demo', () => {
  it('writes a dump and a run sheet that process takes, and says what to type next', async () => {
    const { code, stdout } = await runCli(['demo', 'swirl', '--out', 'demo', '--frames', '12'], { cwd: folder });
    expect(code).toBe(0);
    expect(readdirSync(at('demo')).sort()).toEqual(['swirl.csv', 'swirl.yaml']);
    const next = /^ {2}wakeloom (process .*)$/m.exec(stdout)![1]!;
    const processed = await runCli(next.split(' '), { cwd: folder });
    expect(processed.code).toBe(0);
    expect(processed.stdout).toMatch(/^swirl in a through-flow$/m);
    expect(processed.stdout).toMatch(/Position noise .* mm .*x, y, z/);
  });

  it('finds the computed wake that comes with the program', async () => {
    const { code, stdout } = await runCli(['demo', '--out', 'wake', '--frames', '3'], { cwd: folder });
    expect(code).toBe(0);
    expect(stdout).toMatch(/cylinder-wake\.csv\.gz: [56]\d{3} detections in 3 frames/);
    expect(readdirSync(at('wake')).sort()).toEqual(['cylinder-wake.csv.gz', 'cylinder-wake.yaml']);
  });

  it('does not write over a run sheet unasked', async () => {
    const words = ['demo', 'swirl', '--out', 'demo', '--frames', '2'];
    const [refused] = [await runCli(words, { cwd: folder })];
    expect(refused.code).toBe(2);
    expect(refused.stderr).toContain('--replace');
    expect((await runCli([...words, '--replace', '--quiet'], { cwd: folder })).code).toBe(0);
  });
});

describe('Ctrl-C', () => {
  it('ends a run with 130 and leaves no result', async () => {
    await runCli(['demo', 'swirl', '--out', 'long', '--frames', '120', '--quiet'], { cwd: folder });
    const words = ['process', join('long', 'swirl.yaml'), '--out', join('long', 'result')];
    const killed = await runCli(words, {
      cwd: folder,
      // The first note comes while the work goes on.
      onStderr: (text, kill) => {
        if (!text.includes('stopping')) kill('SIGINT');
      },
    });
    expect(killed.stderr).toContain('stopping; press Ctrl-C again');
    expect([killed.code, killed.stdout]).toEqual([130, '']);
    expect(existsSync(at('long', 'result', 'run.json'))).toBe(false);
    expect((await runCli([...words, '--quiet'], { cwd: folder })).code).toBe(0);
  });
});
