import { mkdirSync, readFileSync, renameSync, rmSync } from 'node:fs';
import { join } from 'node:path';
import { abortedError, WakeloomError } from '@wakeloom/tracker/core/errors';
import { formatCount, formatNumber } from '@wakeloom/tracker/figures/number-format';
import { openFileSink } from '@wakeloom/tracker/node';
import { DEMO_NAMES, type DemoName, type DemoSummary, writeDemo } from '@wakeloom/tracker/synthesis/demo';
import { calledAs } from '../called-as.js';
import { EXIT } from '../exit-codes.js';
import { lookAt } from '../files.js';
import { single } from '../options.js';
import { plainText } from '../plain-text.js';
import type { Terminal } from '../terminal.js';
import type { Args, Verb } from '../verbs.js';
import { longWork, typedWord } from './common.js';

const USAGE = `wakeloom demo [${DEMO_NAMES.join('|')}] [--out DIR]

Writes a dump of made-up detections in a flow that is known, and its run sheet.
${DEMO_NAMES[0]}: light sheet behind a 5 mm cylinder in 30 mm/s of water.
${DEMO_NAMES[1]}: volume in a vortex with flow along its axis.

Examples:
  wakeloom demo --out demo
  wakeloom demo swirl --out demo`;

/** `demo`: makes something to process. */
export const DEMO: Verb = {
  name: 'demo',
  about: 'a made-up dump and its run sheet, to try everything with',
  usage: USAGE,
  options: (parser) =>
    parser
      .option('out', { type: 'string', description: 'Folder for both files; made when missing [demo]' })
      .option('frames', { type: 'string', description: 'Fewer frames, for a quick look' })
      .option('seed', { type: 'string', description: 'Seed of everything drawn at random [1]' })
      .option('replace', { type: 'boolean', description: 'Write over an earlier demo' })
      .option('quiet', { type: 'boolean', description: 'Say nothing but errors' }),
  run: runDemo,
};

async function runDemo(words: readonly string[], args: Args, terminal: Terminal): Promise<number> {
  const name = demoName(words);
  const out = args['out'] === undefined ? 'demo' : single('out', args['out'], 'a folder');
  const frames = wholeOption('frames', args['frames'], 2, 100_000);
  const seed = wholeOption('seed', args['seed'], 0, 0xffffffff);
  const quiet = args['quiet'] === true;
  prepareDemoFolder(out, name, args['replace'] === true);
  const wake = name === 'cylinder-wake' ? wakeField() : undefined;
  const made = await longWork(terminal, quiet, (hooks) =>
    inPartials(out, (makeSink) =>
      writeDemo(name, makeSink, {
        wake,
        seed,
        frames,
        onFrame(done, total) {
          if (hooks.signal.aborted) throw abortedError();
          hooks.onProgress('demo', done, total, 'frames');
        },
      }),
    ),
  );
  if (!quiet) for (const line of demoLines(out, made)) terminal.result(plainText(line));
  return EXIT.done;
}

function demoLines(out: string, made: DemoSummary): string[] {
  const sheet = join(out, made.sheet);
  return [
    `${join(out, made.dump)}: ${formatCount(made.rows)} detections in ${formatCount(made.frames)} frames, displacement ratio ${formatNumber(made.displacementRatio, 2)}`,
    `${sheet}: its run sheet`,
    '',
    'Next:',
    `  ${calledAs()} process ${typedWord(sheet)} --out ${typedWord(join(out, 'result'))}`,
  ];
}

function demoName(words: readonly string[]): DemoName {
  const [name = DEMO_NAMES[0], ...more] = words;
  const found = DEMO_NAMES.find((known) => known === name);
  if (found === undefined || more.length > 0) {
    throw new WakeloomError(
      'usage/demo-name',
      `demo: got "${[name, ...more].join(' ')}", expected one of ${DEMO_NAMES.join(', ')}`,
    );
  }
  return found;
}

function wholeOption(option: string, value: unknown, least: number, most: number): number | undefined {
  if (value === undefined) return undefined;
  const expected = `a whole number from ${least} to ${most}`;
  const text = single(option, value, expected);
  const number = Number(text);
  if (!/^\d+$/.test(text) || number < least || number > most) {
    throw new WakeloomError('usage/options', `--${option}: got "${text}", expected ${expected}`);
  }
  return number;
}

/** Makes the folder; a run sheet that is there already may have been edited, so it is not written over unasked. */
function prepareDemoFolder(out: string, name: DemoName, replace: boolean): void {
  if (!replace && lookAt(join(out, `${name}.yaml`)) !== undefined) {
    throw new WakeloomError(
      'usage/out-not-empty',
      `--out: got "${out}", which holds a ${name}.yaml, expected a folder without one; choose another one, or add --replace to write over it`,
      { path: out },
    );
  }
  try {
    mkdirSync(out, { recursive: true });
  } catch (error) {
    const reason = (error as NodeJS.ErrnoException).code ?? String(error);
    throw new WakeloomError(
      'usage/out-not-writable',
      `--out: got "${out}", which cannot be made (${reason}), expected a folder`,
      { path: out },
      error,
    );
  }
}

/** The computed wake lies beside the packages; the library itself reads no files. */
function wakeField(): Uint8Array {
  const url = new URL('../../../../data/wake-re150.bin.gz', import.meta.url);
  try {
    return readFileSync(url);
  } catch (error) {
    throw new WakeloomError(
      'run/no-demo-field',
      `demo: got no ${url.pathname}, expected the wake field that comes with the program; restore the file, or run node scripts/make-wake.mjs`,
      { path: url.pathname },
      error,
    );
  }
}

/** Lets `write` make files under partial names in the folder, renamed when all are there, removed when it fails. */
async function inPartials<T>(
  folder: string,
  write: (makeSink: (name: string) => ReturnType<typeof openFileSink>) => Promise<T>,
): Promise<T> {
  const names: string[] = [];
  const partial = (name: string) => join(folder, `.partial-${name}`);
  try {
    const value = await write((name) => {
      names.push(name);
      return openFileSink(partial(name));
    });
    for (const name of names) renameSync(partial(name), join(folder, name));
    return value;
  } catch (error) {
    for (const name of names) rmSync(partial(name), { force: true });
    throw error;
  }
}
