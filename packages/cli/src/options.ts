import { WakeloomError } from '@wakeloom/tracker/core/errors';
import { SETTING_TABLE } from '@wakeloom/tracker/run/options';
import { expectedOf } from '@wakeloom/tracker/run/read-setting';
import { isRepeatable, type OptionValue, type SettingRow } from '@wakeloom/tracker/run/setting-kinds';
import type { Argv, Options } from 'yargs';

/** Headings of the help, by the first part of a setting's key. */
const GROUPS: Readonly<Record<string, string>> = {
  run: 'Run:',
  dump: 'Dump:',
  clock: 'Clock:',
  geometry: 'Geometry:',
  fluid: 'Fluid, stream, bodies, tracers:',
  stream: 'Fluid, stream, bodies, tracers:',
  body: 'Fluid, stream, bodies, tracers:',
  tracers: 'Fluid, stream, bodies, tracers:',
  linking: 'Linking:',
  smoothing: 'Smoothing and screening:',
  screening: 'Smoothing and screening:',
  grid: 'Grid:',
  results: 'Results:',
  notes: 'Results:',
  seed: 'Results:',
};

/** Settings that can be given as options: all but the dump's files, which are the words after the verb. */
export const OPTION_ROWS: readonly SettingRow[] = SETTING_TABLE.filter(({ kind }) => kind.type !== 'files');

/** Adds every setting of the one table as an option. All are texts here: the library reads them, units and all. */
export function addSettings<T>(parser: Argv<T>): Argv<T> {
  for (const row of OPTION_ROWS) parser.option(row.option, optionOf(row));
  return parser;
}

function optionOf(row: SettingRow): Options {
  const fallback = row.default === null || row.default === '' ? '' : ` [${String(row.default)}]`;
  const takes =
    row.kind.type === 'choice'
      ? `: ${row.kind.values.join(', ')}`
      : `, such as "${row.example}"${isRepeatable(row.kind) ? '; may be repeated' : ''}`;
  return {
    type: 'string',
    requiresArg: true,
    group: GROUPS[row.key.split('.')[0]!] ?? 'Other settings:',
    description: `${row.help}${takes}${fallback}`,
  };
}

/** The settings among parsed arguments, as the library takes them. One given twice that takes one is a usage error. */
export function givenSettings(args: Readonly<Record<string, unknown>>): Record<string, OptionValue> {
  const given: Record<string, OptionValue> = {};
  for (const row of OPTION_ROWS) {
    const value = args[row.option];
    if (value === undefined) continue;
    const expected = expectedOf(row.kind);
    given[row.option] = isRepeatable(row.kind)
      ? (Array.isArray(value) ? value : [value]).map((each) => single(row.option, each, expected))
      : single(row.option, value, expected);
  }
  return given;
}

/** One text value of an option. Codes: `usage/option-twice`, `usage/option-empty`. */
export function single(option: string, value: unknown, expected: string): string {
  if (Array.isArray(value)) {
    throw new WakeloomError(
      'usage/option-twice',
      `--${option}: got ${value.length} values (${value.join('; ')}), expected one`,
    );
  }
  const text = String(value);
  if (text.trim() === '') {
    throw new WakeloomError('usage/option-empty', `--${option}: got nothing, expected ${expected}`);
  }
  return text;
}

/** Options that a bare `--option` turns on. */
const YES_NO: ReadonlySet<string> = new Set(
  OPTION_ROWS.filter(({ kind }) => kind.type === 'yes-no').map(({ option }) => option),
);

/**
 * Joins `--option value` into `--option=value` for options that take a value, so that a value may start with a minus
 * sign (`--origin "-5, 3 px"`, `--direction -y`), which the parser would take for an option. A yes-or-no option
 * without its word means yes.
 */
export function joinValues(argv: readonly string[], withValue: ReadonlySet<string>): string[] {
  const joined: string[] = [];
  for (let i = 0; i < argv.length; i++) {
    const word = argv[i]!;
    if (word === '--') return [...joined, ...argv.slice(i)];
    const next = argv[i + 1];
    if (word.startsWith('--') && YES_NO.has(word.slice(2)) && !/^(yes|no|true|false)$/.test(next ?? '')) {
      joined.push(`${word}=yes`);
      continue;
    }
    if (word.startsWith('--') && withValue.has(word.slice(2)) && next !== undefined && !next.startsWith('--')) {
      joined.push(`${word}=${next}`);
      i++;
    } else joined.push(word);
  }
  return joined;
}
