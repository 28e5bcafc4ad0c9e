import { createHash } from 'node:crypto';
import { existsSync, mkdirSync, readdirSync, readFileSync, renameSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';

/** Where the sources and the cache lie. */
export interface Places {
  /** Root of the repository. */
  readonly root: string;
  /** Folder of cached truth; null: keep none. */
  readonly cache: string | null;
}

/** Columns by name, as they are kept. */
export type Columns = Readonly<Record<string, Float64Array | Uint32Array | Int32Array>>;

const KINDS = { Float64Array, Uint32Array, Int32Array } as const;

/**
 * What `make` gives, from the cache where it was made before from the same key and the same sources (all files of the
 * folders and files named, relative to the root).
 */
export function cached<T extends Columns>(places: Places, key: unknown, sources: readonly string[], make: () => T): T {
  if (places.cache === null) return make();
  const hash = createHash('sha256').update(JSON.stringify(key)).update(digestOf(places.root, sources));
  const file = join(places.cache, `${hash.digest('hex').slice(0, 24)}.columns`);
  if (existsSync(file)) return read(file) as T;
  const made = make();
  mkdirSync(places.cache, { recursive: true });
  // Another process may make the same: each writes a file of its own and the last rename stands.
  const own = `${file}.${process.pid}`;
  write(own, made);
  renameSync(own, file);
  return made;
}

const digests = new Map<string, Buffer>();

function digestOf(root: string, sources: readonly string[]): Buffer {
  const name = sources.join('|');
  let digest = digests.get(name);
  if (digest === undefined) {
    const hash = createHash('sha256');
    for (const source of sources) {
      const path = join(root, source);
      const files = source.endsWith('/')
        ? readdirSync(path)
            .sort()
            .map((file) => join(path, file))
        : [path];
      for (const file of files) hash.update(readFileSync(file));
    }
    digest = hash.digest();
    digests.set(name, digest);
  }
  return digest;
}

/** A line of JSON that names the columns, then their bytes, each begun at a multiple of 8. */
function write(file: string, columns: Columns): void {
  const names = Object.keys(columns);
  const head = names.map((name) => ({ name, kind: columns[name].constructor.name, length: columns[name].length }));
  const line = JSON.stringify(head);
  const parts: Uint8Array[] = [Buffer.from(`${line.padEnd(8 * Math.ceil((line.length + 1) / 8) - 1)}\n`)];
  for (const name of names) {
    const column = columns[name];
    const bytes = new Uint8Array(8 * Math.ceil(column.byteLength / 8));
    bytes.set(new Uint8Array(column.buffer, column.byteOffset, column.byteLength));
    parts.push(bytes);
  }
  writeFileSync(file, Buffer.concat(parts));
}

function read(file: string): Columns {
  const bytes = readFileSync(file);
  const end = bytes.indexOf(10);
  const head = JSON.parse(bytes.subarray(0, end).toString()) as {
    name: string;
    kind: keyof typeof KINDS;
    length: number;
  }[];
  const all = new Uint8Array(bytes).buffer;
  const columns: Record<string, Float64Array | Uint32Array | Int32Array> = {};
  let at = end + 1;
  for (const { name, kind, length } of head) {
    columns[name] = new KINDS[kind](all, at, length);
    at += 8 * Math.ceil(columns[name].byteLength / 8);
  }
  return columns;
}
