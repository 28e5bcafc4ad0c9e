import type { WrittenPoints } from './setting-kinds.js';
import { describeFound, SettingProblem } from './setting-problem.js';
import { findUnit } from './units.js';

/** Splits a trailing unit off `... 50 50 mm`. */
function splitUnit(text: string): { readonly body: string; readonly unit: string | null } {
  const found = /^(.*[\d.])\s*([A-Za-z\u00b5\u03bc]+)\s*$/s.exec(text.trim());
  if (found === null) return { body: text, unit: null };
  return { body: found[1]!, unit: found[2]! };
}

/** Rows of numbers from `0 0; 5 0; 5 5 mm` or from lists of numbers, with the unit they end in. */
export function readRows(
  raw: unknown,
  width: number,
  expected: string,
): { readonly rows: readonly (readonly number[])[]; readonly unit: string | null } {
  const refuse = (hint: string): never => {
    throw new SettingProblem(`got ${describeFound(raw)}, expected ${expected} (${hint})`);
  };
  let rows: unknown[] = [];
  let unit: string | null = null;
  if (typeof raw === 'string') {
    const split = splitUnit(raw);
    unit = split.unit;
    rows = split.body
      .split(';')
      .filter((row) => row.trim() !== '')
      .map((row) =>
        row
          .trim()
          .split(/[\s,]+/)
          .map(Number),
      );
  } else if (Array.isArray(raw)) rows = raw;
  else refuse('neither a list nor a text');
  if (unit !== null) {
    const known = findUnit(unit, 'length');
    if (known === null) refuse(`unit "${unit}" is not known`);
    else unit = known.symbol;
  }
  rows.forEach((row, index) => {
    const fits = Array.isArray(row) && row.length === width && row.every((value) => Number.isFinite(value));
    if (!fits) refuse(`row ${index + 1} is not ${width} numbers`);
  });
  return { rows: rows as number[][], unit };
}

/** Control points: at least three rows of dump x, dump y, true x, true y. Throws `SettingProblem`. */
export function readPoints(raw: unknown, expected: string): WrittenPoints {
  const { rows, unit } = readRows(raw, 4, expected);
  if (rows.length < 3) throw new SettingProblem(`got ${rows.length} control points, expected at least 3`);
  return { rows: rows as unknown as WrittenPoints['rows'], unit };
}
