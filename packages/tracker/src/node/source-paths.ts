import type { ByteSource } from '../core/bytes.js';

const paths = new WeakMap<ByteSource, string>();

/** Notes that a source is this file on the disk, so that HDF5 can open it in place. Returns the source. */
export function rememberPath(source: ByteSource, path: string): ByteSource {
  paths.set(source, path);
  return source;
}

/** Path of a source that is a file on the disk, else null. */
export function pathOf(source: ByteSource): string | null {
  return paths.get(source) ?? null;
}
