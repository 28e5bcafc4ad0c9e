import { type Document, isMap, isScalar, LineCounter, type Node, parseDocument } from 'yaml';
import { nearestWord } from '../core/nearest-word.js';
import { problemError } from './given-settings.js';
import { SETTING_TABLE } from './options.js';
import { describeFound } from './setting-problem.js';
import type { ParsedSheet, Place } from './sheet-form.js';
import { runSheetSchema } from './sheet-schema.js';
import { quoteUnitLists } from './unit-lists.js';

type Path = readonly PropertyKey[];

interface Reading {
  readonly document: Document.Parsed;
  readonly place: (offset: number) => Place;
}

function read(text: string): Reading {
  const counter = new LineCounter();
  const document = parseDocument(quoteUnitLists(text), { lineCounter: counter, prettyErrors: false });
  return {
    document,
    place: (offset) => {
      const { line, col } = counter.linePos(offset);
      return { line, column: col };
    },
  };
}

/** Where the value at `path` stands; of something missing, where its parent stands. */
function placeOf({ document, place }: Reading, path: Path): Place {
  for (let length = path.length; length > 0; length--) {
    const node = document.getIn(path.slice(0, length), true) as Node | undefined;
    if (node?.range) return place(node.range[0]);
  }
  return place(document.contents?.range[0] ?? 0);
}

/** Where a key stands inside the mapping at `path`. */
function placeOfKey(reading: Reading, path: Path, key: string): Place {
  const parent = path.length === 0 ? reading.document.contents : reading.document.getIn(path, true);
  if (isMap(parent)) {
    for (const pair of parent.items) {
      if (isScalar(pair.key) && String(pair.key.value) === key && pair.key.range)
        return reading.place(pair.key.range[0]);
    }
  }
  return placeOf(reading, path);
}

/** Names that may stand directly below `path`. */
function namesBelow(path: Path): readonly string[] {
  const prefix = path.map((part) => `${String(part)}.`).join('');
  const names = SETTING_TABLE.filter((row) => row.key.startsWith(prefix)).map(
    (row) => row.key.slice(prefix.length).split('.')[0]!,
  );
  return [...new Set(names)];
}

function unknownKey(path: Path, key: string): string {
  const names = namesBelow(path);
  const near = nearestWord(key, names);
  if (near !== null) return `got an unknown key "${key}", expected a known one (nearest is "${near}")`;
  const elsewhere = SETTING_TABLE.find((row) => row.key.split('.').pop() === key);
  if (elsewhere !== undefined) return `got the key "${key}" here, expected it as ${elsewhere.key}`;
  return `got an unknown key "${key}", expected one of ${names.join(', ')}`;
}

function notAGroup(path: Path, value: unknown): string {
  const names = namesBelow(path);
  const example = SETTING_TABLE.find((row) => row.key.startsWith(path.map((part) => `${String(part)}.`).join('')));
  const hint = path.length === 0 || example === undefined ? '' : `, written { ${example.key.split('.').pop()}: ... }`;
  return `got ${describeFound(value)}, expected keys such as ${names.slice(0, 4).join(', ')}${hint}`;
}

function yamlProblems({ document, place }: Reading, name: string): string[] {
  return [...document.errors, ...document.warnings].map((error) => {
    const at = place(error.pos[0]);
    const what = error.message.replace(/\s+/g, ' ').trim();
    return `${name}:${at.line}:${at.column}: YAML: got text that does not parse (${what}), expected "key: value" lines`;
  });
}

function schemaProblems(reading: Reading, value: unknown, name: string): string[] {
  const outcome = runSheetSchema().safeParse(value);
  if (outcome.success) return [];
  const found: { readonly at: Place; readonly text: string }[] = [];
  for (const issue of outcome.error.issues) {
    const key = issue.path.map(String).join('.');
    if (issue.code === 'unrecognized_keys') {
      for (const unknown of issue.keys) {
        const full = key === '' ? unknown : `${key}.${unknown}`;
        found.push({
          at: placeOfKey(reading, issue.path, unknown),
          text: `${full}: ${unknownKey(issue.path, unknown)}`,
        });
      }
      continue;
    }
    const at = placeOf(reading, issue.path);
    const group = issue.code === 'invalid_type';
    const text = group ? notAGroup(issue.path, reading.document.getIn(issue.path)) : issue.message;
    found.push({ at, text: key === '' ? text : `${key}: ${text}` });
  }
  found.sort((a, b) => a.at.line - b.at.line || a.at.column - b.at.column);
  return found.map(({ at, text }) => `${name}:${at.line}:${at.column}: ${text}`);
}

/**
 * Reads a run sheet (YAML 1.2) and checks it whole: every key, every figure and unit. `name` is the file's name for
 * messages. What fits together (a rate beside pairs, a bin in mm without a scale) is looked at by `resolveRun`,
 * since options may change it.
 *
 * Code `sheet/invalid`: the message holds every problem, each as `file:line:column: key: got X, expected Y`, with
 * the nearest known key where one is near; `details.problems` holds them as a list.
 *
 * @example
 * const sheet = parseRunSheet('clock: { rate: 60 +- 0.01 Hz }', 'cylinder.yaml');
 * sheet.values['clock.rate']; // '60 +- 0.01 Hz'
 */
export function parseRunSheet(text: string, name: string): ParsedSheet {
  const reading = read(text.replace(/^\ufeff/, ''));
  const refuse = (problems: readonly string[]) => problemError('sheet/invalid', `run sheet ${name}`, problems);
  const broken = yamlProblems(reading, name);
  if (broken.length > 0) throw refuse(broken);
  const value: unknown = reading.document.toJS() ?? {};
  const problems = schemaProblems(reading, value, name);
  if (problems.length > 0) throw refuse(problems);
  const values: Record<string, unknown> = {};
  const places: Record<string, Place> = {};
  for (const { key } of SETTING_TABLE) {
    const path = key.split('.');
    let at: unknown = value;
    for (const part of path)
      at = typeof at === 'object' && at !== null ? (at as Record<string, unknown>)[part] : undefined;
    if (at === undefined) continue;
    values[key] = at;
    places[key] = placeOf(reading, path);
  }
  return { name, values, places };
}
