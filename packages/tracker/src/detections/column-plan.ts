import { WakeloomError } from '../core/errors.js';
import { nearestWord } from '../core/nearest-word.js';
import type { ColumnRef, DumpSettings } from '../run/settings.js';
import { KNOWN_NAMES, plainName } from './column-names.js';
import { ROLE, ROLES, type Role } from './row-batch.js';

/** Which column of a file carries which role. */
export interface ColumnPlan {
  /** 0-based column of each role in the order of ROLES, -1 where the file has none. */
  readonly index: Int32Array;
  /** How each was found, for people: `x: column 3 "x_px"`, columns counted from 1. */
  readonly described: Readonly<Record<string, string>>;
  /** True when there is no frame column and frames are numbered by the distinct times instead. */
  readonly framesFromTimes: boolean;
}

/** What is known of a file's columns before any row is read. */
export interface FileColumns {
  readonly file: string;
  /** Header names, or null when the file has none. */
  readonly names: readonly string[] | null;
  readonly count: number;
  /** Whether the values of the first column look like frame numbers; only asked where there are no names. */
  readonly firstIsWhole: boolean;
  /** False when each file is one frame and its number comes from the name or the order. */
  readonly needsFrame: boolean;
  /** True when the time column is the clock: then it goes before others that share a name, and can stand in for frame numbers. */
  readonly timesAreClock?: boolean;
}

/**
 * Finds the columns of a file by the settings: by name, by 0-based position, or for `auto` by KNOWN_NAMES. Without a
 * header and without any position given, three columns are frame, x, y (two are x, y in one file a frame); anything
 * else would be a guess. Where the time column is the clock and nothing is a frame column, frames are numbered by the
 * distinct times, and three columns without a header are time, x, y.
 *
 * Throws `dump/no-such-column` (with the nearest name) and `dump/columns-unclear` (telling how to name columns).
 */
export function planColumns(columns: FileColumns, settings: DumpSettings['columns']): ColumnPlan {
  const index = new Int32Array(ROLES.length).fill(-1);
  const wanted = ROLES.filter((role) => role !== 'frame' || columns.needsFrame);
  for (const role of wanted) {
    const reference = settings[role];
    if (reference !== 'auto' && reference !== null) index[ROLES.indexOf(role)] = explicit(role, reference, columns);
  }
  const timesAreClock = columns.timesAreClock === true;
  const open = wanted.filter((role) => settings[role] === 'auto');
  // A column "t" could be both: the clock needs it more.
  if (timesAreClock && open.includes('time')) open.unshift(...open.splice(open.indexOf('time'), 1));
  if (columns.names !== null) {
    const taken = new Set(index);
    for (const role of open) {
      const at = automatic(role, columns.names, taken, columns.file);
      index[ROLES.indexOf(role)] = at;
      if (at >= 0) taken.add(at);
    }
  } else if (wanted.every((role) => index[ROLES.indexOf(role)] < 0)) byPosition(index, open, columns);

  const framesFromTimes =
    timesAreClock && columns.needsFrame && settings.frame === 'auto' && index[ROLE.frame] < 0 && index[ROLE.time] >= 0;
  for (const role of ['frame', 'x', 'y'] as const) {
    if (role === 'frame' && framesFromTimes) continue;
    if (wanted.includes(role) && index[ROLES.indexOf(role)] < 0) throw missing(role, columns);
  }
  const users = new Map<number, Role>();
  for (const role of wanted) {
    const at = index[ROLES.indexOf(role)];
    if (at < 0) continue;
    const other = users.get(at);
    if (other !== undefined) {
      throw new WakeloomError(
        'dump/columns-unclear',
        `one column for two purposes: got column ${at + 1} for both ${other} and ${role}, expected different ones (${columns.file})`,
        { file: columns.file, column: at },
      );
    }
    users.set(at, role);
  }
  const described: Record<string, string> = {};
  for (const [at, role] of users) {
    described[role] = `column ${at + 1}${columns.names === null ? '' : ` "${columns.names[at]}"`}`;
  }
  if (framesFromTimes) described['frame'] = 'place among the distinct times, from 0';
  return { index, described, framesFromTimes };
}

function explicit(role: Role, reference: Exclude<ColumnRef, null>, columns: FileColumns): number {
  const { file, names, count } = columns;
  if (typeof reference === 'number') {
    if (Number.isInteger(reference) && reference >= 0 && reference < count) return reference;
    throw new WakeloomError(
      'dump/no-such-column',
      `no such column for ${role}: got position ${reference}, expected 0 to ${count - 1} (${file} has ${count} columns)`,
      { file, role, position: reference, columns: count },
    );
  }
  if (names === null) {
    throw new WakeloomError(
      'dump/no-such-column',
      `no such column for ${role}: got the name "${reference}", expected a position from 0 to ${count - 1} (${file} has no header; set header: yes if its first line is one)`,
      { file, role, name: reference, columns: count },
    );
  }
  const same = (test: (name: string) => boolean) => names.flatMap((name, at) => (test(name) ? [at] : []));
  let found = same((name) => name === reference);
  if (found.length === 0) found = same((name) => name.trim().toLowerCase() === reference.trim().toLowerCase());
  if (found.length === 1) return found[0];
  if (found.length > 1) {
    throw new WakeloomError(
      'dump/columns-unclear',
      `column name not unique: got "${reference}" in columns ${found.map((at) => at + 1).join(' and ')}, expected one; give ${role} by position, counted from 0 (${file})`,
      { file, role, name: reference },
    );
  }
  const near = nearestWord(reference, names);
  throw new WakeloomError(
    'dump/no-such-column',
    `no such column for ${role}: got the name "${reference}", expected one of ${list(names)}${near === null ? '' : `; did you mean "${near}"?`} (header of ${file})`,
    { file, role, name: reference, names: names.slice(0, 50), nearest: near },
  );
}

function automatic(role: Role, names: readonly string[], taken: ReadonlySet<number>, file: string): number {
  const plain = names.map(plainName);
  for (const known of KNOWN_NAMES[role]) {
    const found = plain.flatMap((name, at) => (name === known && !taken.has(at) ? [at] : []));
    if (found.length === 1) return found[0];
    if (found.length > 1) {
      // One written exactly like the known word wins over its variants with a unit.
      const exact = found.filter((at) => names[at].trim().toLowerCase() === known);
      if (exact.length === 1) return exact[0];
      throw new WakeloomError(
        'dump/columns-unclear',
        `more than one column could be ${role}: got ${list(found.map((at) => names[at]))}, expected one; name it, such as columns: { ${role}: ${JSON.stringify(names[found[0]])} } (header of ${file})`,
        { file, role, names: found.map((at) => names[at]) },
      );
    }
  }
  return -1;
}

/** Positions where nothing but the number of columns speaks; leaves `index` alone when that is not enough. */
function byPosition(index: Int32Array, open: readonly Role[], columns: FileColumns): void {
  const first: Role = columns.timesAreClock === true ? 'time' : 'frame';
  const order: Role[] = columns.needsFrame ? [first, 'x', 'y'] : ['x', 'y'];
  const clear =
    columns.count === order.length &&
    order.every((role) => open.includes(role)) &&
    (!columns.needsFrame || first === 'time' || columns.firstIsWhole);
  if (!clear) {
    const example = columns.needsFrame ? 'columns: { frame: 0, x: 1, y: 2 }' : 'columns: { x: 0, y: 1 }';
    throw new WakeloomError(
      'dump/columns-unclear',
      `columns not clear: got ${columns.count} columns without a header, expected ${order.join(', ')} alone, or positions counted from 0 such as ${example} (${columns.file})`,
      { file: columns.file, columns: columns.count },
    );
  }
  for (const [at, role] of order.entries()) index[ROLES.indexOf(role)] = at;
}

function missing(role: Role, columns: FileColumns): WakeloomError {
  const { file, names } = columns;
  const near = names === null ? null : nearestWord(role, names);
  const got = names === null ? 'no position for it' : `the names ${list(names)}`;
  const advice = near === null ? `columns: { ${role}: NAME }` : `columns: { ${role}: ${JSON.stringify(near)} }`;
  return new WakeloomError(
    'dump/no-such-column',
    `no column for ${role}: got ${got}, expected ${KNOWN_NAMES[role].slice(0, 3).join(', ')} or a setting such as ${advice} (${file})`,
    { file, role, names: names === null ? null : names.slice(0, 50), nearest: near },
  );
}

function list(names: readonly string[]): string {
  const shown = names.slice(0, 12).map((name) => `"${name}"`);
  return names.length > 12 ? `${shown.join(', ')} and ${names.length - 12} more` : shown.join(', ');
}
