import { isWakeloomError, WakeloomError } from '../core/errors.js';
import { nearestWord } from '../core/nearest-word.js';
import type { Quantity } from '../core/quantity.js';
import { SETTING_TABLE } from './options.js';
import { readSetting } from './read-setting.js';
import type { OptionValue, QuantityVector, SettingRow, SettingValue } from './setting-kinds.js';
import { SettingProblem } from './setting-problem.js';
import type { Origin } from './settings.js';
import type { ParsedSheet } from './sheet-form.js';

interface Given {
  readonly value: SettingValue;
  readonly origin: Origin;
}

/**
 * What was given for each setting and by whom: option over sheet over default. Problems are collected, not thrown,
 * so that a person sees all of them at once; `settle` throws when there are any.
 */
export class GivenSettings {
  readonly #given = new Map<string, Given>();
  readonly #sheet: ParsedSheet | undefined;
  readonly #problems: { readonly text: string; readonly origin: Origin }[] = [];

  constructor(sheet: ParsedSheet | undefined, options: Readonly<Record<string, OptionValue>>) {
    this.#sheet = sheet;
    const names = SETTING_TABLE.map((row) => row.option);
    for (const name of Object.keys(options)) {
      if (names.includes(name)) continue;
      const near = nearestWord(name, names);
      const hint = near === null ? '' : ` (nearest is --${near})`;
      this.#problems.push({ text: `--${name}: got an unknown option, expected a known one${hint}`, origin: 'option' });
    }
    for (const row of SETTING_TABLE) this.#read(row, options[row.option]);
  }

  #read(row: SettingRow, option: OptionValue | undefined): void {
    const inSheet = this.#sheet !== undefined && Object.hasOwn(this.#sheet.values, row.key);
    const origin: Origin = option !== undefined ? 'option' : inSheet ? 'sheet' : 'default';
    let raw: unknown = origin === 'option' ? option : origin === 'sheet' ? this.#sheet!.values[row.key] : row.default;
    // Digits on a command line are a position; a column named by digits needs the run sheet, where quotes tell.
    if (origin === 'option' && row.kind.type === 'column' && /^\d+$/.test(String(raw))) raw = Number(raw);
    if (origin === 'default' && raw === null) {
      this.#given.set(row.key, { value: null, origin });
      return;
    }
    try {
      this.#given.set(row.key, { value: readSetting(row, raw), origin });
    } catch (error) {
      if (!(error instanceof SettingProblem)) throw error;
      this.#given.set(row.key, { value: null, origin });
      this.#problems.push({ text: `${this.#where(row, origin)}: ${error.message}`, origin });
    }
  }

  #where(row: SettingRow, origin: Origin): string {
    if (origin === 'option') return `--${row.option}`;
    const place = origin === 'sheet' ? this.#sheet?.places[row.key] : undefined;
    return place === undefined ? row.key : `${this.#sheet!.name}:${place.line}:${place.column}: ${row.key}`;
  }

  #row(key: string): SettingRow {
    const row = SETTING_TABLE.find((candidate) => candidate.key === key);
    if (row === undefined)
      throw new WakeloomError('usage/no-such-setting', `setting: got ${key}, expected one of SETTING_TABLE`);
    return row;
  }

  origin(key: string): Origin {
    this.#row(key);
    return this.#given.get(key)!.origin;
  }

  /** True when a sheet or an option gave it (and it could be read). */
  has(key: string): boolean {
    return this.origin(key) !== 'default' && this.value(key) !== null;
  }

  value(key: string): SettingValue {
    this.#row(key);
    return this.#given.get(key)!.value;
  }

  text(key: string): string {
    return this.value(key) as string;
  }

  number(key: string): number {
    return this.value(key) as number;
  }

  quantity(key: string): Quantity | null {
    const value = this.value(key);
    return value === 'auto' ? null : (value as Quantity | null);
  }

  vector(key: string): QuantityVector | null {
    const value = this.value(key);
    return value === 'auto' ? null : (value as QuantityVector | null);
  }

  /** Notes a problem with a setting: `text` is worded `got X, expected Y`. */
  problem(key: string, text: string): void {
    const origin = this.origin(key);
    this.#problems.push({ text: `${this.#where(this.#row(key), origin)}: ${text}`, origin });
  }

  /** Runs `step`, taking a coded error as a problem of `key`; `fallback` is then returned and never used. */
  attempt<T>(key: string, fallback: T, step: () => T): T {
    try {
      return step();
    } catch (error) {
      if (!isWakeloomError(error)) throw error;
      this.problem(key, error.message.replace(/^[^:]*: (?=got )/, ''));
      return fallback;
    }
  }

  /** Throws when there were problems: `sheet/invalid` if all of them stand in the sheet, else `usage/settings`. */
  settle(): void {
    if (this.#problems.length === 0) return;
    const lines = this.#problems.map((problem) => problem.text);
    const inSheet = this.#problems.every((problem) => problem.origin === 'sheet');
    throw problemError(inSheet ? 'sheet/invalid' : 'usage/settings', inSheet ? 'run sheet' : 'settings', lines);
  }
}

/** All problems in one error, one a line; each already worded `where: got X, expected Y`. */
export function problemError(
  code: 'sheet/invalid' | 'usage/settings',
  what: string,
  lines: readonly string[],
): WakeloomError {
  const message =
    lines.length === 1
      ? lines[0]!
      : `${what}: got ${lines.length} problems, expected none\n${lines.map((line) => `  ${line}`).join('\n')}`;
  return new WakeloomError(code, message, { problems: lines, count: lines.length });
}
