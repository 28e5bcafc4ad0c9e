import { realpathSync, renameSync, rmSync } from 'node:fs';
import { basename, dirname, extname, isAbsolute, join, relative, sep } from 'node:path';
import { WakeloomError } from '@wakeloom/tracker/core/errors';
import { formatBytes, formatCount } from '@wakeloom/tracker/figures/number-format';
import { openFileSink } from '@wakeloom/tracker/node';
import { EXPORTERS, findExporter } from '@wakeloom/tracker/store/exports/registry';
import { EXIT } from '../exit-codes.js';
import { type ExportWish, openExport, verifyFolder } from '../export-result.js';
import { lookAt } from '../files.js';
import { single } from '../options.js';
import { isOurResult } from '../out-folder.js';
import { plainText } from '../plain-text.js';
import type { Terminal } from '../terminal.js';
import type { Args, Verb } from '../verbs.js';
import { longWork } from './common.js';

const USAGE = `wakeloom export DIR pathlines|grid [--format FORMAT] [--out FILE]

Writes pathlines (one row a sample) or the grid (one row a bin) of a result
folder in a format that other software reads. CSV goes to standard output
unless --out names a file.

Examples:
  wakeloom export demo/result pathlines --out pathlines.csv
  wakeloom export demo/result grid --format vtk --out grid.vti
  wakeloom export demo/result grid --normalise "5 mm, 30 mm/s" > grid.csv`;

/** `export`: data to stdout or a file; words about it to stderr. */
export const EXPORT: Verb = {
  name: 'export',
  about: `pathlines or grid of a result folder as ${EXPORTERS.map(({ format }) => format).join(', ')}`,
  usage: USAGE,
  options: (parser) =>
    parser
      .option('format', {
        type: 'string',
        description: `${EXPORTERS.map(({ format, help }) => `${format} (${help})`).join('; ')} [csv]`,
      })
      .option('out', { type: 'string', description: 'File to write, outside the result folder' })
      .option('replace', { type: 'boolean', description: 'Write over an existing file' })
      .option('verify', {
        type: 'boolean',
        description: 'First read the whole result back and hold it against the digest in run.json',
      })
      .option('normalise', {
        type: 'string',
        description: 'Divide by a length and a speed, such as "5 mm, 30 mm/s": x/L, u/U, t U/L, stresses/U2',
      })
      .option('quiet', { type: 'boolean', description: 'Say nothing but errors' }),
  run: runExport,
};

async function runExport(words: readonly string[], args: Args, terminal: Terminal): Promise<number> {
  const wish = readWish(words, args);
  const quiet = args['quiet'] === true;
  const out = args['out'] === undefined ? null : single('out', args['out'], 'a file');
  if (out === null && wish.format !== 'csv') {
    const { extension } = findExporter(wish.format);
    throw new WakeloomError(
      'usage/no-out',
      `--out: got nothing, expected a file for ${wish.format}, such as --out ${wish.what}${extension[wish.what]} (only csv goes to standard output)`,
    );
  }
  if (out !== null) checkOutFile(out, wish, args['replace'] === true);
  if (args['verify'] === true) await longWork(terminal, quiet, (hooks) => verifyFolder(wish.folder, hooks));
  const opened = await openExport(wish);
  const summary = await longWork(terminal, quiet, async (hooks) => {
    if (out === null) return opened.write(terminal.dataSink(), hooks);
    return throughPartial(out, async (partial) => {
      const sink = await openFileSink(partial);
      try {
        return await opened.write(sink, hooks);
      } finally {
        await sink.close();
      }
    });
  }).finally(opened.close);
  if (quiet) return EXIT.done;
  const { rows, columns, bytes, remarks } = summary;
  const where = out === null ? '' : ` in ${out}`;
  terminal.say(
    plainText(`${formatCount(rows)} rows of ${formatCount(columns.length)} columns, ${formatBytes(bytes)}${where}`),
  );
  for (const remark of remarks) terminal.say(plainText(`note ${remark}`));
  return EXIT.done;
}

function readWish(words: readonly string[], args: Args): ExportWish {
  const [folder, what, ...more] = words;
  if (folder === undefined) {
    throw new WakeloomError(
      'usage/no-input',
      'export: got no result folder, expected wakeloom export DIR pathlines|grid',
    );
  }
  if ((what !== 'pathlines' && what !== 'grid') || more.length > 0) {
    const got = what === undefined ? 'nothing' : `"${[what, ...more].join(' ')}"`;
    throw new WakeloomError('usage/export-what', `export: got ${got} after the folder, expected pathlines or grid`);
  }
  const format = args['format'] === undefined ? 'csv' : single('format', args['format'], 'a format').toLowerCase();
  findExporter(format);
  if (lookAt(folder)?.isDirectory() !== true) {
    throw new WakeloomError(
      'usage/no-such-folder',
      `export: got "${folder}", which is no folder, expected a result folder (wakeloom process makes one)`,
      { path: folder },
    );
  }
  if (!isOurResult(folder)) {
    throw new WakeloomError(
      'usage/not-a-result',
      `export: got "${folder}", which holds no readable run.json, expected the folder of a finished run; process the run again`,
      { path: folder },
    );
  }
  const normalise =
    args['normalise'] === undefined ? null : single('normalise', args['normalise'], 'a length and a speed');
  return { folder, what, format, normalise };
}

/** Refuses, before any work, what cannot be written or must not be written over. */
function checkOutFile(out: string, wish: ExportWish, replace: boolean): void {
  const found = lookAt(out);
  if (found?.isDirectory() === true) {
    throw new WakeloomError('usage/out-not-a-file', `--out: got "${out}", which is a folder, expected a file`, {
      path: out,
    });
  }
  if (lookAt(dirname(out))?.isDirectory() !== true) {
    throw new WakeloomError(
      'usage/no-such-folder',
      `--out: got "${out}", whose folder does not exist, expected a file in an existing folder`,
      { path: out },
    );
  }
  checkExtension(out, wish);
  if (isWithin(out, wish.folder)) {
    throw new WakeloomError(
      'usage/out-in-result',
      `--out: got "${out}", which lies in the result folder "${wish.folder}", expected a file outside it; a result keeps only its own files`,
      { path: out },
    );
  }
  if (found !== undefined && !replace) {
    throw new WakeloomError(
      'usage/out-exists',
      `--out: got "${out}", which exists, expected a new file; choose another name, or add --replace to write over it`,
      { path: out },
    );
  }
}

/** Whether a file lies, or would lie, in the folder or below it; links are followed. */
function isWithin(file: string, folder: string): boolean {
  const way = relative(realpathSync(folder), join(realpathSync(dirname(file)), basename(file)));
  return way !== '..' && !way.startsWith(`..${sep}`) && !isAbsolute(way);
}

/** VTK software tells its formats by the ending alone: XML under another one is not opened, or taken for something else. */
function checkExtension(out: string, { format, what }: ExportWish): void {
  const ending = extname(out).toLowerCase();
  const own = findExporter(format).extension[what];
  if (!/^\.(vtk|vt[a-z])$/.test(ending) || ending === own) return;
  const why =
    format !== 'vtk'
      ? `expected ${own} for ${format}; or add --format vtk`
      : `expected ${own}: ${what} are written as VTK XML, not in the legacy format or as another kind of data`;
  throw new WakeloomError('usage/out-extension', `--out: got "${out}", ${why}`, { path: out });
}

/** Writes beside the file and renames at the end, so that a broken export never passes for a whole one. */
async function throughPartial<T>(out: string, write: (partial: string) => Promise<T>): Promise<T> {
  const partial = `${out}.partial`;
  try {
    const result = await write(partial);
    renameSync(partial, out);
    return result;
  } catch (error) {
    rmSync(partial, { force: true });
    throw error;
  }
}
