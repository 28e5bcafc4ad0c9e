import { createHash } from 'node:crypto';
import { crc32 } from 'node:zlib';
import type { Hasher } from '../core/bytes.js';

/** Streaming SHA-256 of Node's crypto (about 1 GB/s). */
export function nodeHasher(): Hasher {
  const hash = createHash('sha256');
  return { update: (bytes) => void hash.update(bytes), hex: () => hash.digest('hex') };
}

/** CRC-32 of Node's zlib (about 7 GB/s where SHA-256 makes 1 to 2). */
export function nodeChecksum(): Hasher {
  let sum = 0;
  return {
    update(bytes) {
      sum = crc32(bytes, sum);
    },
    hex: () => sum.toString(16).padStart(8, '0'),
  };
}
