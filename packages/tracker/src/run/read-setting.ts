import { isWakeloomError } from '../core/errors.js';
import { nearestWord } from '../core/nearest-word.js';
import { DIMENSION_WORDS, parseQuantity } from './parse-quantity.js';
import { readBodies } from './read-bodies.js';
import { readPoints } from './read-points.js';
import { readVector } from './read-vector.js';
import type { SettingKind, SettingRow, SettingValue } from './setting-kinds.js';
import { describeFound, SettingProblem } from './setting-problem.js';

/** What a kind takes, as it stands after "expected" in a message. */
export function expectedOf(kind: SettingKind): string {
  const auto = 'auto' in kind && kind.auto ? ', or auto' : '';
  switch (kind.type) {
    case 'text':
      return 'a text';
    case 'choice':
      return `one of ${kind.values.join(', ')}`;
    case 'yes-no':
      return 'yes or no';
    case 'whole': {
      const odd = kind.odd ? 'an odd whole number' : 'a whole number';
      return `${odd} from ${kind.least} to ${kind.most}${auto}`;
    }
    case 'number':
      return `a number from ${kind.least} to ${kind.most}`;
    case 'share':
      return `a share from 0 to ${kind.most}, such as 0.05 or "5 %"`;
    case 'quantity': {
      const { name, example } = DIMENSION_WORDS[kind.dimension];
      return `${name}${kind.sign === 'positive' ? ' above zero' : ''} such as "${example}"${auto}`;
    }
    case 'vector': {
      const count = kind.least === kind.most ? `${kind.least}` : `${kind.least} to ${kind.most}`;
      const example = kind.dimension === 'speed' ? '30, 0 mm/s' : kind.least === 1 ? '2 mm' : '812, 640 px';
      return `${count} figures with one unit such as "${example}"${auto}`;
    }
    case 'column':
      return 'a column name, a position counted from 0, none, or auto';
    case 'files':
      return 'a file name or a list of them';
    case 'direction':
      return '+x, -x, +y, -y, +z, -z, or a vector such as "1, 0.1"';
    case 'bodies':
      return 'bodies such as "circle 0, 0, 5 mm" or { circle: { centre: [0, 0] mm, diameter: 5 mm } }';
    case 'points':
      return 'rows of dump x, dump y, true x, true y';
    case 'notes':
      return 'notes by name, such as "operator: A. Name" or { operator: A. Name }';
  }
}

function fail(kind: SettingKind, raw: unknown, hint = ''): never {
  throw new SettingProblem(`got ${describeFound(raw)}, expected ${expectedOf(kind)}${hint}`);
}

function readNumber(kind: SettingKind, raw: unknown): number {
  const value = typeof raw === 'string' && raw.trim() !== '' ? Number(raw) : raw;
  if (typeof value !== 'number' || !Number.isFinite(value)) return fail(kind, raw);
  return value;
}

function readYesNo(kind: SettingKind, raw: unknown): boolean {
  if (raw === true || raw === 'yes' || raw === 'true') return true;
  if (raw === false || raw === 'no' || raw === 'false') return false;
  return fail(kind, raw);
}

function readChoice(kind: Extract<SettingKind, { type: 'choice' }>, raw: unknown): string {
  const text = raw === true ? 'yes' : raw === false ? 'no' : raw;
  if (typeof text === 'string' && kind.values.includes(text)) return text;
  const near = typeof text === 'string' ? nearestWord(text, kind.values) : null;
  return fail(kind, raw, near === null ? '' : ` (nearest is "${near}")`);
}

function readFiles(kind: SettingKind, raw: unknown): readonly string[] {
  const list = Array.isArray(raw) ? raw : [raw];
  if (list.length === 0 || !list.every((name) => typeof name === 'string' && name.trim() !== ''))
    return fail(kind, raw);
  return list as string[];
}

function readColumn(kind: SettingKind, raw: unknown): string | number | null {
  if (raw === null || raw === 'none') return null;
  // A command line cannot tell 3 from "3": digits alone are a position there, in a sheet quotes make them a name.
  if (typeof raw === 'number' && Number.isInteger(raw) && raw >= 0) return raw;
  if (typeof raw === 'string' && raw.trim() !== '') return raw;
  return fail(kind, raw);
}

const AXES: Readonly<Record<string, readonly number[]>> = {
  '+x': [1, 0, 0],
  '-x': [-1, 0, 0],
  '+y': [0, 1, 0],
  '-y': [0, -1, 0],
  '+z': [0, 0, 1],
  '-z': [0, 0, -1],
  x: [1, 0, 0],
  y: [0, 1, 0],
  z: [0, 0, 1],
};

/** Unit vector of a direction. */
function readDirection(kind: SettingKind, raw: unknown): readonly number[] {
  if (typeof raw === 'string' && AXES[raw.trim()] !== undefined) return AXES[raw.trim()]!;
  const parts = Array.isArray(raw)
    ? raw
    : typeof raw === 'string'
      ? raw.split(/[\s,]+/).filter((part) => part !== '')
      : [];
  const values = parts.map((part) =>
    typeof part === 'number' || typeof part === 'string' ? Number(part) : Number.NaN,
  );
  const length = Math.hypot(...values);
  if (values.length < 2 || values.length > 3 || !(length > 0) || !Number.isFinite(length)) return fail(kind, raw);
  return [values[0]! / length, values[1]! / length, (values[2] ?? 0) / length];
}

function readNotes(kind: SettingKind, raw: unknown): Readonly<Record<string, string>> {
  const notes: Record<string, string> = {};
  // A text holds notes with semicolons between them; in a list each text is one note, semicolons and all.
  const lines = typeof raw === 'string' ? raw.split(';').filter((piece) => piece.trim() !== '') : raw;
  if (Array.isArray(lines)) {
    for (const line of lines as readonly unknown[]) {
      const colon = typeof line === 'string' ? line.indexOf(':') : -1;
      if (colon <= 0) return fail(kind, line);
      const name = (line as string).slice(0, colon).trim();
      if (Object.hasOwn(notes, name)) throw new SettingProblem(`got the note "${name}" twice, expected each once`);
      notes[name] = (line as string).slice(colon + 1).trim();
    }
    return notes;
  }
  if (typeof raw !== 'object' || raw === null) return fail(kind, raw);
  for (const [name, value] of Object.entries(raw)) {
    if (value !== null && typeof value === 'object')
      throw new SettingProblem(`got ${describeFound(value)} in ${name}, expected a text`);
    notes[name] = value === null ? '' : String(value);
  }
  return notes;
}

function readQuantity(kind: Extract<SettingKind, { type: 'quantity' }>, raw: unknown): SettingValue {
  if (raw === 'auto' && kind.auto) return 'auto';
  if (typeof raw !== 'string' && typeof raw !== 'number') return fail(kind, raw);
  try {
    const quantity = parseQuantity(String(raw), kind.dimension);
    if (kind.sign === 'positive' && !(quantity.value > 0)) return fail(kind, raw);
    return quantity;
  } catch (error) {
    if (!isWakeloomError(error)) throw error;
    const hint = /\([^()]*\)$/.exec(error.message);
    return fail(kind, raw, hint === null ? '' : ` ${hint[0]}`);
  }
}

function readShare(kind: Extract<SettingKind, { type: 'share' }>, raw: unknown): number {
  let value = Number.NaN;
  if (typeof raw === 'number') value = raw;
  else if (typeof raw === 'string' && raw.trim().endsWith('%')) value = Number(raw.trim().slice(0, -1)) / 100;
  else if (typeof raw === 'string' && raw.trim() !== '') value = Number(raw);
  return value >= 0 && value <= kind.most ? value : fail(kind, raw);
}

/**
 * The value of a setting from what a run sheet or an option holds. Both go through here, so that both take and
 * refuse the same things. Throws `SettingProblem` ("got ..., expected ...") without saying where: the caller knows.
 *
 * Forms: choice, text -> string; yes-no -> boolean; whole, number, share -> number; quantity -> Quantity; vector ->
 * QuantityVector; column -> string | number | null; files -> string[]; direction -> unit vector [3]; bodies ->
 * WrittenBody[]; points -> WrittenPoints; notes -> Record; `auto` stays `auto`.
 */
export function readSetting(row: SettingRow, raw: unknown): SettingValue {
  const { kind } = row;
  switch (kind.type) {
    case 'text':
      if (typeof raw === 'number') return String(raw);
      return typeof raw === 'string' && raw.trim() !== '' ? raw : fail(kind, raw);
    case 'choice':
      return readChoice(kind, raw);
    case 'yes-no':
      return readYesNo(kind, raw);
    case 'whole': {
      if (raw === 'auto' && kind.auto) return 'auto';
      const value = readNumber(kind, raw);
      const fits =
        Number.isInteger(value) && value >= kind.least && value <= kind.most && !(kind.odd && value % 2 === 0);
      return fits ? value : fail(kind, raw);
    }
    case 'number': {
      const value = readNumber(kind, raw);
      return value >= kind.least && value <= kind.most ? value : fail(kind, raw);
    }
    case 'share':
      return readShare(kind, raw);
    case 'quantity':
      return readQuantity(kind, raw);
    case 'vector':
      return raw === 'auto' && kind.auto ? 'auto' : readVector(kind, raw, expectedOf(kind));
    case 'column':
      return readColumn(kind, raw);
    case 'files':
      return readFiles(kind, raw);
    case 'direction':
      return readDirection(kind, raw);
    case 'bodies':
      return readBodies(raw, expectedOf(kind));
    case 'points':
      return readPoints(raw, expectedOf(kind));
    case 'notes':
      return readNotes(kind, raw);
  }
}
