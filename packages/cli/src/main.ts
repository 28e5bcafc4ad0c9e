import { isWakeloomError, WakeloomError } from '@wakeloom/tracker/core/errors';
import { nearestWord } from '@wakeloom/tracker/core/nearest-word';
import { DEMO } from './commands/demo.js';
import { EXPORT } from './commands/export.js';
import { PROCESS } from './commands/process.js';
import { EXIT, exitCodeOf } from './exit-codes.js';
import { errorText } from './messages.js';
import { processTerminal, READER_GONE, type Terminal } from './terminal.js';
import { helpText, makeParser, parseVerb, type Verb, verbParser } from './verbs.js';
import { programVersion } from './version.js';

/** Every verb there is, in the order of the help. */
const VERBS: readonly Verb[] = [PROCESS, EXPORT, DEMO];

/**
 * Runs the command. Never throws and never exits: the caller sets the exit code (0 done, 1 failed, 2 wrong usage or
 * run sheet, 130 interrupted).
 * @param argv words after the program's name
 */
export async function main(argv: readonly string[], terminal: Terminal = processTerminal()): Promise<number> {
  try {
    return await dispatch(argv, terminal);
  } catch (error) {
    if (isWakeloomError(error) && error.code === READER_GONE) return EXIT.done;
    terminal.say(errorText(error, terminal));
    return exitCodeOf(error);
  }
}

async function dispatch(argv: readonly string[], terminal: Terminal): Promise<number> {
  const [first, ...rest] = argv;
  if (first === undefined) {
    terminal.say(await overview(terminal));
    return EXIT.usage;
  }
  if (first === '--version' || first === '-v') {
    terminal.result(programVersion());
    return EXIT.done;
  }
  if (first === '--help' || first === '-h' || (first === 'help' && rest.length === 0)) {
    terminal.result(await overview(terminal));
    return EXIT.done;
  }
  const name = first === 'help' ? rest[0]! : first;
  const verb = VERBS.find((candidate) => candidate.name === name);
  if (verb === undefined) throw unknownVerb(name);
  const parser = verbParser(verb, terminal);
  if (first === 'help' || rest.includes('--help') || rest.includes('-h')) {
    terminal.result(await helpText(verb.usage, parser));
    return EXIT.done;
  }
  const { words, args } = parseVerb(parser, rest);
  return verb.run(words, args, terminal);
}

function unknownVerb(name: string): WakeloomError {
  const names = VERBS.map((verb) => verb.name);
  const near = nearestWord(name, names);
  const hint = near === null ? '' : `; nearest is ${near}`;
  return new WakeloomError(
    'usage/unknown-verb',
    `wakeloom: got "${name}", expected one of ${names.join(', ')}${hint} (wakeloom --help)`,
  );
}

function overview(terminal: Terminal): Promise<string> {
  const width = Math.max(...VERBS.map(({ name }) => name.length)) + 2;
  const usage = [
    'wakeloom VERB ...',
    '',
    'Links detections of tracer particles into pathlines, gives velocity and',
    'acceleration with standard errors, and mean fields on a grid.',
    '',
    'Verbs:',
    ...VERBS.map(({ name, about }) => `  ${name.padEnd(width)}${about}`),
    '',
    'Start here:',
    '  wakeloom demo --out demo',
    '  wakeloom process demo/cylinder-wake.yaml --out demo/result',
  ];
  const parser = makeParser(terminal)
    .option('version', { type: 'boolean', alias: 'v', description: 'Show the version', group: 'Options:' })
    .epilogue(
      'wakeloom VERB --help shows the options of a verb and examples that work.\n' +
        'Exit codes: 0 done, 1 failed, 2 wrong usage or run sheet, 130 interrupted.\n' +
        'NO_COLOR, TERM=dumb and --quiet are kept; WAKELOOM_DEBUG=1 shows where an\nerror happened.',
    );
  return helpText(usage.join('\n'), parser);
}
