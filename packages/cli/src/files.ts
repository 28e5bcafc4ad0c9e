import { accessSync, constants, readdirSync, type Stats, statSync } from 'node:fs';
import { basename, dirname, isAbsolute, join, resolve, sep } from 'node:path';
import { WakeloomError } from '@wakeloom/tracker/core/errors';

/** What lies at a path; undefined when nothing does, also where part of the path is a file. */
export function lookAt(path: string): Stats | undefined {
  try {
    return statSync(path, { throwIfNoEntry: false });
  } catch (error) {
    if ((error as NodeJS.ErrnoException).code === 'ENOTDIR') return undefined;
    throw error;
  }
}

/** Order in which people count: digits by value, `frame_9` before `frame_10`; ties by code units. */
export function naturalOrder(a: string, b: string): number {
  const [left, right] = [splitDigits(a), splitDigits(b)];
  for (let i = 0; i < Math.min(left.length, right.length); i++) {
    const [p, q] = [left[i]!, right[i]!];
    if (p === q) continue;
    if (/^\d/.test(p) && /^\d/.test(q)) {
      const [m, n] = [p.replace(/^0+(?=\d)/, ''), q.replace(/^0+(?=\d)/, '')];
      if (m.length !== n.length) return m.length - n.length;
      if (m !== n) return m < n ? -1 : 1;
      continue;
    }
    return p < q ? -1 : 1;
  }
  return left.length - right.length || (a < b ? -1 : a > b ? 1 : 0);
}

function splitDigits(text: string): string[] {
  return text.match(/\d+|\D+/g) ?? [];
}

/**
 * Files that paths and globs (`*`, `?`, `[0-9]`, `**`) stand for: each pattern's matches in natural order, in the
 * order given. A shell that expands globs itself changes nothing but the order within one pattern.
 * Relative ones count from `folder`. Codes: `usage/no-such-file`, `usage/not-a-file`, `usage/not-readable`.
 */
export function expandFiles(patterns: readonly string[], folder = '.'): string[] {
  const files: string[] = [];
  for (const pattern of patterns) {
    const path = isAbsolute(pattern) || folder === '.' ? pattern : join(folder, pattern);
    const exact = lookAt(path);
    if (exact === undefined && hasWildcard(path)) files.push(...matches(path));
    else files.push(path);
  }
  for (const file of files) checkReadable(file);
  return files;
}

function hasWildcard(path: string): boolean {
  return /[*?[]/.test(path);
}

function checkReadable(file: string): void {
  const found = lookAt(file);
  if (found === undefined) {
    const near = neighboursOf(file);
    throw new WakeloomError(
      'usage/no-such-file',
      `input file: got "${file}", which does not exist, expected a dump or a run sheet${near === '' ? '' : ` (${near})`}`,
      { path: file },
    );
  }
  if (!found.isFile()) {
    throw new WakeloomError(
      'usage/not-a-file',
      `input file: got "${file}", which is a folder, expected a file; for one file a frame give a pattern such as "${join(file, '*.csv')}"`,
      { path: file },
    );
  }
  try {
    accessSync(file, constants.R_OK);
  } catch (error) {
    throw new WakeloomError(
      'usage/not-readable',
      `input file: got "${file}", which may not be read, expected a readable file; change its permissions`,
      { path: file },
      error,
    );
  }
}

function neighboursOf(file: string): string {
  const folder = dirname(file);
  if (lookAt(folder)?.isDirectory() !== true) return `the folder "${folder}" does not exist`;
  const start = basename(file)
    .replace(/\.[^.]*$/, '')
    .toLowerCase();
  const near = readdirSync(folder).filter((name) => name.toLowerCase().startsWith(start.slice(0, 4)));
  return near.length === 0 ? '' : `there is ${near.sort(naturalOrder).slice(0, 3).join(', ')}`;
}

/** Files below the fixed part of a pattern whose whole path it fits. */
function matches(pattern: string): string[] {
  const parts = pattern.split(sep === '\\' ? /[\\/]/ : '/');
  const fixed: string[] = [];
  while (parts.length > 0 && !hasWildcard(parts[0]!)) fixed.push(parts.shift()!);
  const root = fixed.length === 0 ? '.' : fixed.join(sep) || sep;
  const found: string[] = [];
  const walk = (folder: string, rest: readonly string[]) => {
    const [head, ...tail] = rest;
    if (lookAt(folder)?.isDirectory() !== true) return;
    if (head === '**') walk(folder, tail);
    for (const entry of readdirSync(folder, { withFileTypes: true })) {
      const path = folder === '.' && fixed.length === 0 ? entry.name : join(folder, entry.name);
      if (head === '**') {
        if (entry.isDirectory()) walk(path, rest);
      } else if (head !== undefined && partPattern(head).test(entry.name)) {
        if (tail.length > 0) walk(path, tail);
        else if (!entry.isDirectory()) found.push(path);
      }
    }
  };
  walk(root, parts);
  if (found.length === 0) {
    throw new WakeloomError(
      'usage/no-such-file',
      `input files: got the pattern "${pattern}", which fits no file, expected at least one (looked in ${resolve(root)})`,
      { path: pattern },
    );
  }
  return [...new Set(found)].sort(naturalOrder);
}

function partPattern(part: string): RegExp {
  const source = part
    .replace(/[.+^${}()|\\]/g, '\\$&')
    .replace(/\*+/g, '.*')
    .replace(/\?/g, '.')
    .replace(/\[!/g, '[^');
  try {
    // As shells do: a leading dot is matched only by a written one.
    return new RegExp(`^${part.startsWith('.') ? '' : '(?!\\.)'}${source}$`);
  } catch (error) {
    throw new WakeloomError('usage/bad-pattern', `file pattern: got "${part}", expected balanced brackets`, {}, error);
  }
}

/** A name that every file system takes, Windows included: reserved characters and device names changed, never empty. */
export function safeName(text: string): string {
  const name = text
    .normalize('NFC')
    // biome-ignore lint/suspicious/noControlCharactersInRegex: Windows refuses them in file names.
    .replace(/[<>:"/\\|?*\u0000-\u001f]/g, '-')
    .replace(/\s+/g, ' ')
    .trim()
    .replace(/[. ]+$/, '')
    .slice(0, 120);
  if (name === '') return 'run';
  return /^(con|prn|aux|nul|com\d|lpt\d)(\.|$)/i.test(name) ? `_${name}` : name;
}
