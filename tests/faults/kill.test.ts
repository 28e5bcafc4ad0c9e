import { spawn } from 'node:child_process';
import {
  cpSync,
  existsSync,
  mkdirSync,
  mkdtempSync,
  readdirSync,
  readFileSync,
  rmSync,
  watch,
  writeFileSync,
} from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import type { RunRecord } from '@wakeloom/tracker/store/run-record';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { stateOfFolder } from '../helpers/result-columns.js';
import { runCli } from '../helpers/run-cli.js';
import { vortexDump } from '../helpers/vortex-dump.js';

const BIN = fileURLToPath(new URL('../../packages/cli/bin/wakeloom.mjs', import.meta.url));
const folder = mkdtempSync(join(tmpdir(), 'kill-'));
const at = (name: string) => join(folder, name);
afterAll(() => rmSync(folder, { recursive: true, force: true }));

const words = (out: string, ...more: string[]) => [
  ...['process', at('dump.csv'), '--rate', '100 Hz', '--scale', '0.05 mm/px', '--threads', '2', '--quiet'],
  ...['--out', out, ...more],
];
const contentOf = (out: string) =>
  (JSON.parse(readFileSync(join(out, 'run.json'), 'utf8')) as RunRecord).digest.content;
const partials = (out: string) => readdirSync(out).filter((file) => file.startsWith('.partial-'));

let seconds: number;
let digest: string;
let olderDigest: string;

beforeAll(async () => {
  writeFileSync(at('dump.csv'), await vortexDump(75, 1000));
  expect((await runCli(words(at('older'), '--bin', '6 mm'))).code).toBe(0);
  olderDigest = contentOf(at('older'));
  const started = performance.now();
  expect((await runCli(words(at('undisturbed')))).code).toBe(0);
  seconds = (performance.now() - started) / 1000;
  digest = contentOf(at('undisturbed'));
  expect(digest).not.toBe(olderDigest);
}, 120_000);

/** When to strike: a share of the undisturbed run's time, or so many ms after a file of that name appears. */
type Instant = { readonly share: number } | { readonly file: string; readonly after: number };

/** Runs the command as a process group of its own and kills the group at the instant. */
function struck(
  out: string,
  instant: Instant,
  signal: NodeJS.Signals,
): Promise<{ code: number | null; files: string }> {
  return new Promise((resolve) => {
    const child = spawn(process.execPath, [BIN, ...words(out, '--replace')], { detached: true, stdio: 'ignore' });
    let files = '';
    const strike = () => {
      files = readdirSync(out).join(' ');
      try {
        process.kill(-child.pid!, signal);
      } catch {
        // The run was faster than the blow; its folder must then be whole.
      }
    };
    const watcher = watch(out, (_, name) => {
      if (!('file' in instant) || name !== instant.file) return;
      watcher.close();
      setTimeout(strike, instant.after);
    });
    const timer = 'share' in instant ? setTimeout(strike, instant.share * seconds * 1000) : undefined;
    child.on('close', (code) => {
      clearTimeout(timer);
      watcher.close();
      resolve({ code, files });
    });
  });
}

// Seeded: six instants spread over the time of the run, six in the writing of its files.
const random = randomStream(20240611, 'kill');
const instants: Instant[] = [
  ...Array.from({ length: 6 }, (_, k) => ({ share: (k + random.uniform()) / 6 })),
  { file: '.partial-scratch-samples', after: 100 * random.uniform() },
  { file: '.partial-pathlines.nc', after: 60 * random.uniform() },
  { file: 'pathlines.nc', after: 10 * random.uniform() },
  { file: '.partial-frames.nc', after: 60 * random.uniform() },
  { file: 'grid.nc', after: 5 * random.uniform() },
  { file: '.partial-run.json', after: 0 },
];

describe('SIGKILL', () => {
  it('at 12 instants leaves no result or a sound one, and a rerun succeeds', async () => {
    let killed = 0;
    let kept = 0;
    for (const [k, instant] of instants.entries()) {
      const out = at(`struck-${k}`);
      // Every second time over a finished older result, which must stay whole until the new one takes its place.
      const over = k % 2 === 1;
      if (over) cpSync(at('older'), out, { recursive: true });
      else mkdirSync(out);
      const { code, files } = await struck(out, instant, 'SIGKILL');
      const state = await stateOfFolder(out);
      console.log(`${JSON.stringify(instant)}: ${code === null ? 'killed' : `exit ${code}`}, ${state}; held ${files}`);
      if (code === null) killed++;
      else expect(code).toBe(0);
      expect(['none', 'sound']).toContain(state);
      // Between two results there is none for the milliseconds in which names change, from a partial run.json on.
      const changing = files.split(' ').includes('.partial-run.json') || !files.split(' ').includes('run.json');
      if (over && !changing) {
        expect(state).toBe('sound');
        kept++;
      }
      if (state === 'sound') {
        expect([olderDigest, digest]).toContain(contentOf(out));
        if (code === 0) expect(contentOf(out)).toBe(digest);
      } else expect(existsSync(join(out, 'run.json'))).toBe(false);

      const again = await runCli(words(out, '--replace'));
      expect([again.code, again.stderr]).toEqual([0, '']);
      expect(await stateOfFolder(out)).toBe('sound');
      expect(contentOf(out)).toBe(digest);
      expect(partials(out)).toEqual([]);
    }
    // Otherwise the instants tell nothing.
    expect(killed).toBeGreaterThanOrEqual(9);
    expect(kept).toBeGreaterThanOrEqual(4);
  }, 300_000);
});

describe('SIGINT', () => {
  it('ends the run with 130 and an empty folder', async () => {
    const out = at('interrupted');
    mkdirSync(out);
    const { code } = await struck(out, { file: '.partial-scratch-samples', after: 0 }, 'SIGINT');
    expect(code).toBe(130);
    expect(readdirSync(out)).toEqual([]);
  }, 60_000);

  it('leaves an earlier result as it was, and says so', async () => {
    const out = at('interrupted-over');
    cpSync(at('older'), out, { recursive: true });
    const spoken = words(out, '--replace').filter((word) => word !== '--quiet');
    let struckOnce = false;
    const { code, stderr } = await runCli(spoken, {
      onStderr: (text, kill) => {
        // The first note says that the work begins; its first scratch file is not far.
        if (struckOnce || !text.includes('replaces the result of run dump once')) return;
        struckOnce = true;
        setTimeout(() => kill('SIGINT'), 0.5 * seconds * 1000);
      },
    });
    expect(code).toBe(130);
    expect(stderr).toContain(`${out} still holds the complete earlier result of run dump`);
    expect(await stateOfFolder(out)).toBe('sound');
    expect(contentOf(out)).toBe(olderDigest);
    expect(partials(out)).toEqual([]);
    const refused = await runCli(words(out));
    expect([refused.code, refused.stdout]).toEqual([2, '']);
    expect(refused.stderr).toMatch(/another run, "dump" \(differs in grid\.bin\).*--replace/);
    expect(contentOf(out)).toBe(olderDigest);
  }, 60_000);
});
