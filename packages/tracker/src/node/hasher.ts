import { createHash } from 'node:crypto';
import type { Hasher } from '../core/bytes.js';

/** Streaming SHA-256 of Node's crypto (about 1 GB/s). */
export function nodeHasher(): Hasher {
  const hash = createHash('sha256');
  return { update: (bytes) => void hash.update(bytes), hex: () => hash.digest('hex') };
}
