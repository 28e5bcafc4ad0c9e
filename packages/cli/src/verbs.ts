import { WakeloomError } from '@wakeloom/tracker/core/errors';
import { nearestWord } from '@wakeloom/tracker/core/nearest-word';
import yargs, { type Argv } from 'yargs';
import { joinValues } from './options.js';
import type { Terminal } from './terminal.js';

/** Options as the parser returns them, by their name on the command line. */
export type Args = Readonly<Record<string, unknown>>;

/** One verb: how it is described, its options, and what it does with the words after it. Returns the exit code. */
export interface Verb {
  readonly name: string;
  /** One line for the list of verbs. */
  readonly about: string;
  /** How it is used, what it does, examples that work: printed as it stands, so that lines can be copied. */
  readonly usage: string;
  /** Adds the options. */
  readonly options: (parser: Argv) => Argv;
  readonly run: (words: readonly string[], args: Args, terminal: Terminal) => Promise<number>;
}

/** A parser that never exits, prints or translates by itself, and takes every value as the text it is. */
export function makeParser(terminal: Pick<Terminal, 'columns'>): Argv {
  return yargs()
    .scriptName('wakeloom')
    .locale('en')
    .exitProcess(false)
    .help(false)
    .version(false)
    .wrap(Math.min(110, terminal.columns))
    .parserConfiguration({
      'boolean-negation': false,
      'camel-case-expansion': false,
      'dot-notation': false,
      'parse-numbers': false,
      'parse-positional-numbers': false,
      'short-option-groups': false,
      'duplicate-arguments-array': true,
    })
    .option('help', { type: 'boolean', alias: 'h', description: 'Show this help', group: 'Options:' });
}

/** The parser of a verb, ready for help or for arguments. */
export function verbParser(verb: Verb, terminal: Pick<Terminal, 'columns'>): Argv {
  return verb.options(makeParser(terminal)).strictOptions();
}

/** Usage and options of a parser, without the parser's own type marks: every value here is written as a person would. */
export async function helpText(usage: string, parser: Argv): Promise<string> {
  return `${usage}\n\n${(await parser.getHelp()).replace(/\s+\[(string|boolean)\]$/gm, '')}`;
}

/** Arguments of a verb. Codes: `usage/unknown-option`, `usage/options` for what else the parser refuses. */
export function parseVerb(parser: Argv, argv: readonly string[]): { words: string[]; args: Args } {
  const { string: texts, key } = (
    parser as unknown as { getOptions(): { string: string[]; key: Record<string, unknown> } }
  ).getOptions();
  const known = Object.keys(key);
  parser.fail((message, error) => {
    throw usageError(message, error, known);
  });
  const parsed = parser.parseSync(joinValues(argv, new Set(texts)));
  const { _: words, $0: _program, ...args } = parsed as Record<string, unknown> & { _: (string | number)[] };
  return { words: words.map(String), args };
}

function usageError(message: string | null, error: Error | undefined, known: readonly string[]): Error {
  const unknown = /^Unknown arguments?: (.+)$/.exec(message ?? '');
  if (unknown !== null) {
    const name = unknown[1]!.split(', ')[0]!;
    const near = nearestWord(name, known);
    const hint = near === null ? '' : `; nearest is --${near}`;
    return new WakeloomError(
      'usage/unknown-option',
      `--${name}: got an option that does not exist, expected a known one${hint} (--help lists them)`,
    );
  }
  const without = /^Not enough arguments following: (.+)$/.exec(message ?? '');
  if (without !== null)
    return new WakeloomError('usage/options', `--${without[1]}: got no value, expected one after it`);
  return error ?? new WakeloomError('usage/options', `options: ${message ?? 'could not be read'} (--help lists them)`);
}
