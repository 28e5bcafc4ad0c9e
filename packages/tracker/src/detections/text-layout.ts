import { WakeloomError } from '../core/errors.js';
import type { DumpSettings } from '../run/settings.js';
import { KNOWN_NAMES, plainName } from './column-names.js';
import { parseNumberInto } from './number-text.js';
import { BYTE, fieldText, splitFields } from './text-fields.js';

/** How a text dump is written. */
export interface TextLayout {
  /** Separating byte; blank stands for any run of blanks and tabs. */
  readonly separator: number;
  /** Decimal mark, point or comma. */
  readonly decimal: number;
  /** Fields of a whole row. */
  readonly fields: number;
  readonly names: readonly string[] | null;
  /** The first line that is neither blank nor a comment is a header and no data. */
  readonly headerIsLine: boolean;
  /** Whether the first field of the sniffed rows is always a whole number. */
  readonly firstIsWhole: boolean;
  readonly remarks: readonly string[];
}

/** Lines looked at: enough that a first frame without decimals does not decide, few enough to cost nothing. */
const LINES = 400;

const SEPARATORS = { comma: BYTE.comma, semicolon: BYTE.semicolon, tab: BYTE.tab, blank: BYTE.blank } as const;

/** Guesses in the order in which equal ones win. A comma cannot both separate and mark decimals. */
const GUESSES: readonly (readonly [number, number])[] = [
  [BYTE.tab, BYTE.point],
  [BYTE.semicolon, BYTE.point],
  [BYTE.comma, BYTE.point],
  [BYTE.blank, BYTE.point],
  [BYTE.tab, BYTE.comma],
  [BYTE.semicolon, BYTE.comma],
  [BYTE.blank, BYTE.comma],
];

/**
 * Finds separator, decimal mark, number of fields and header from the first lines of a file. `bytes[start .. end - 1]`
 * are whole lines, byte-order mark left out. `known` is the layout of an earlier file of the same dump: its
 * separator and decimal mark hold, and its header where this file has none. Null when there is no line but blank
 * ones and comments.
 *
 * A first line is a header when more of its fields are words than numbers. A last comment line before the data whose
 * words include known column names and whose number of fields fits serves as header too.
 *
 * Throws `dump/no-separator`, `dump/decimal-is-separator`, `dump/not-text`, `dump/old-line-ends`.
 */
export function sniffText(
  bytes: Uint8Array,
  start: number,
  end: number,
  settings: DumpSettings,
  file: string,
  known: TextLayout | null,
): TextLayout | null {
  refuseBinary(bytes, start, end, file);
  const { lines, comment } = contentLines(bytes, start, end);
  if (lines.length === 0) return null;
  const rows = lines.length > 1 ? lines.slice(1) : lines;
  const [separator, decimal] = known ? [known.separator, known.decimal] : guess(bytes, rows, lines[0], settings, file);

  const number = new Float64Array(1);
  const isNumber = (from: number, to: number) => parseNumberInto(bytes, from, to, decimal, number, 0);
  const first = splitFields(bytes, lines[0][0], lines[0][1], separator);
  let words = 0;
  let numbers = 0;
  for (let i = 0; i < first.length; i += 2) {
    if (isNumber(first[i], first[i + 1])) numbers++;
    else if (fieldText(bytes, first[i], first[i + 1]) !== '') words++;
  }
  const headerIsLine = settings.header === 'auto' ? words > numbers : settings.header === 'yes';
  const data = headerIsLine ? lines.slice(1) : lines;
  const counts = data.map(([from, to]) => splitFields(bytes, from, to, separator).length / 2);
  const usual = mode(counts);

  const remarks: string[] = [];
  let names: string[] | null = null;
  if (headerIsLine) names = fieldNames(bytes, first);
  else if (settings.header !== 'no' && comment !== null) {
    const fromComment = commentNames(bytes, comment, separator, usual);
    if (fromComment !== null) {
      names = fromComment;
      if (known === null) remarks.push(`column names taken from a comment line of ${file}`);
    }
  }
  let fields = names?.length ?? usual;
  if (names !== null && usual !== fields && usual > 0) {
    const trailing = (row: readonly [number, number]) => {
      const split = splitFields(bytes, row[0], row[1], separator);
      return split.length / 2 !== usual || fieldText(bytes, split[split.length - 2], split[split.length - 1]) === '';
    };
    if (usual === fields + 1 && data.every(trailing)) fields = usual;
    else if (usual === fields - 1 && names[names.length - 1] === '') fields = usual;
    names = [...names, ''].slice(0, Math.max(fields, 0));
  }
  if (names === null && known !== null && known.names !== null && usual === known.fields) names = [...known.names];

  let firstIsWhole = data.length > 0;
  for (const [from, to] of data) {
    const split = splitFields(bytes, from, to, separator);
    if (split.length > 0 && isNumber(split[0], split[1]) && !Number.isInteger(number[0])) firstIsWhole = false;
  }
  if (known === null) {
    if (decimal === BYTE.comma) remarks.push(`decimal commas taken as such in ${file}`);
    if (!headerIsLine && names === null) remarks.push(`no header in ${file}: columns taken by position`);
  }
  return { separator, decimal, fields, names, headerIsLine, firstIsWhole, remarks };
}

/** Lines that hold something, as [start, end), and the last comment before the first of them. */
function contentLines(bytes: Uint8Array, start: number, end: number) {
  const lines: (readonly [number, number])[] = [];
  let comment: readonly [number, number] | null = null;
  let at = start;
  while (at < end && lines.length < LINES) {
    let stop = bytes.indexOf(BYTE.lineFeed, at);
    if (stop < 0 || stop > end) stop = end;
    let from = at;
    while (from < stop && (bytes[from] === BYTE.blank || bytes[from] === BYTE.tab || bytes[from] === BYTE.return))
      from++;
    if (from < stop) {
      if (bytes[from] === BYTE.hash) {
        if (lines.length === 0) comment = [from + 1, stop];
      } else lines.push([at, stop]);
    }
    at = stop + 1;
  }
  return { lines, comment };
}

function guess(
  bytes: Uint8Array,
  rows: readonly (readonly [number, number])[],
  first: readonly [number, number],
  settings: DumpSettings,
  file: string,
): readonly [number, number] {
  const separator = settings.separator === 'auto' ? null : SEPARATORS[settings.separator];
  const decimal = settings.decimal === 'auto' ? null : settings.decimal === 'comma' ? BYTE.comma : BYTE.point;
  if (separator === BYTE.comma && decimal === BYTE.comma) {
    throw new WakeloomError(
      'dump/decimal-is-separator',
      `separator and decimal mark: got a comma for both, expected different ones (settings of ${file})`,
      { file },
    );
  }
  const allowed = GUESSES.filter(
    ([s, d]) => (separator === null || s === separator) && (decimal === null || d === decimal),
  );
  const number = new Float64Array(1);
  let best: readonly [number, number] | null = null;
  let bestScore = 0;
  for (const pair of allowed) {
    const splits = rows.map(([from, to]) => splitFields(bytes, from, to, pair[0]));
    const usual = mode(splits.map((split) => split.length / 2));
    if (usual < 2) continue;
    let good = 0;
    let all = 0;
    let whole = 0;
    for (const split of splits) {
      if (split.length / 2 === usual) whole++;
      all += split.length / 2;
      for (let i = 0; i < split.length; i += 2) {
        if (parseNumberInto(bytes, split[i], split[i + 1], pair[1], number, 0)) good++;
      }
    }
    // Words score a little, so that a lone header still tells its separator.
    const score = ((good + 0.01 * (all - good)) / all) * (whole / splits.length);
    if (score > bestScore) {
      best = pair;
      bestScore = score;
    }
  }
  if (best !== null) return best;
  // One field a line whatever the guess: only a stated separator can be believed.
  if (separator !== null) return [separator, decimal ?? BYTE.point];
  throw new WakeloomError(
    'dump/no-separator',
    `no separator found: got lines such as ${JSON.stringify(fieldText(bytes, first[0], Math.min(first[1], first[0] + 60)))}, expected at least two columns parted by comma, semicolon, tab or blank (${file})`,
    { file },
  );
}

function commentNames(
  bytes: Uint8Array,
  comment: readonly [number, number],
  separator: number,
  fields: number,
): string[] | null {
  const known = new Set(Object.values(KNOWN_NAMES).flat());
  // Writers often part the words of such a line by blanks whatever parts their numbers.
  for (const by of [separator, BYTE.blank, BYTE.comma, BYTE.semicolon, BYTE.tab]) {
    const names = fieldNames(bytes, splitFields(bytes, comment[0], comment[1], by));
    if (names.length === fields && names.filter((name) => known.has(plainName(name))).length >= 2) return names;
  }
  return null;
}

function fieldNames(bytes: Uint8Array, split: readonly number[]): string[] {
  const names: string[] = [];
  for (let i = 0; i < split.length; i += 2) names.push(fieldText(bytes, split[i], split[i + 1]));
  return names;
}

/** Most frequent value, the first of equally frequent ones; 0 of none. */
function mode(values: readonly number[]): number {
  const counts = new Map<number, number>();
  let best = 0;
  let bestCount = 0;
  for (const value of values) counts.set(value, (counts.get(value) ?? 0) + 1);
  for (const [value, count] of counts) {
    if (count > bestCount) {
      best = value;
      bestCount = count;
    }
  }
  return best;
}

/** Share of control bytes in the head above which a file is taken for binary (common practice, no source). */
const BINARY_SHARE = 0.05;

function refuseBinary(bytes: Uint8Array, start: number, end: number, file: string): void {
  let control = 0;
  let feeds = 0;
  let returns = 0;
  const to = Math.min(end, start + 65536);
  for (let i = start; i < to; i++) {
    const byte = bytes[i];
    if (byte === BYTE.lineFeed) feeds++;
    else if (byte === BYTE.return) returns++;
    else if (byte < 32 && byte !== BYTE.tab && byte !== 12) control++;
  }
  if (control > BINARY_SHARE * (to - start)) {
    throw new WakeloomError(
      'dump/not-text',
      `not a text file: got ${control} control bytes in the first ${to - start}, expected lines of numbers in ASCII or UTF-8, or a NPY, HDF5 or Parquet file (${file})`,
      { file },
    );
  }
  if (feeds <= 1 && returns > 1) {
    throw new WakeloomError(
      'dump/old-line-ends',
      `line ends: got carriage returns alone, expected LF or CRLF; convert the file's line ends (${file})`,
      { file },
    );
  }
}
