import type { SettingKind, SettingRow } from './setting-kinds.js';

/** A text of any content. */
export const text: SettingKind = { type: 'text' };
/** A column of a dump. */
export const column: SettingKind = { type: 'column' };
/** From .. to .. along one axis. */
export const range: SettingKind = { type: 'vector', dimension: 'length', least: 2, most: 2, sign: 'any' };

/** One of a few words. */
export function choice(...values: string[]): SettingKind {
  return { type: 'choice', values };
}

/** A row of the table, in the order in which it is read: key, option, kind, default, example, help. */
export function row(
  key: string,
  option: string,
  kind: SettingKind,
  fallback: SettingRow['default'],
  example: string,
  help: string,
): SettingRow {
  return { key, option, kind, default: fallback, example, help };
}
