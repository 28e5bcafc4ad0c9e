import { WakeloomError } from '../core/errors.js';
import type { DumpSettings } from '../run/settings.js';
import type { DumpScan } from './dump.js';

export type FileFormat = DumpScan['format'];

/** First bytes that tell a kind of file: RFC 1952, RFC 8878, NEP 1, HDF5 format specification III.A, Parquet format. */
export const FILE_MAGIC = {
  gzip: [0x1f, 0x8b],
  zstd: [0x28, 0xb5, 0x2f, 0xfd],
  npy: [0x93, 0x4e, 0x55, 0x4d, 0x50, 0x59],
  hdf5: [0x89, 0x48, 0x44, 0x46, 0x0d, 0x0a, 0x1a, 0x0a],
  parquet: [0x50, 0x41, 0x52, 0x31],
  'utf-16 le': [0xff, 0xfe],
  'utf-16 be': [0xfe, 0xff],
} as const;

/** Bytes that `fileFormat` wants to see. */
export const HEAD_BYTES = 8;

/** Endings that promise a format whose first bytes can be checked. */
const ENDINGS: readonly (readonly [RegExp, 'npy' | 'hdf5' | 'parquet'])[] = [
  [/\.npy$/i, 'npy'],
  [/\.(h5|hdf5|hdf|nc)$/i, 'hdf5'],
  [/\.(parquet|pq)$/i, 'parquet'],
];

export function hasMagic(head: Uint8Array, magic: readonly number[]): boolean {
  return head.length >= magic.length && magic.every((byte, i) => head[i] === byte);
}

/**
 * What kind of file this is: the setting if it names one, else the first bytes, else the ending, else text. `head` is
 * the start of the file after decompression, `packed` tells whether there was any.
 *
 * Throws `dump/not-npy`, `dump/not-hdf5`, `dump/not-parquet` when setting or ending promise what the bytes do not
 * hold, `dump/packed-binary` for a compressed binary format, `dump/utf-16`.
 */
export function fileFormat(
  head: Uint8Array,
  packed: boolean,
  name: string,
  setting: DumpSettings['format'],
): FileFormat {
  const byMagic = (['npy', 'hdf5', 'parquet'] as const).find((format) => hasMagic(head, FILE_MAGIC[format]));
  if (byMagic !== undefined && packed) {
    throw new WakeloomError(
      'dump/packed-binary',
      `compressed ${byMagic} file: got ${byMagic} inside gzip or zstd, expected it uncompressed; unpack it first (${name})`,
      { file: name, format: byMagic },
    );
  }
  const plain = name.replace(/\.(gz|zst)$/i, '');
  const promised =
    setting !== 'auto' ? setting : (byMagic ?? ENDINGS.find(([ending]) => ending.test(plain))?.[1] ?? 'text');
  if (promised !== 'text' && promised !== byMagic && head.length > 0) {
    throw new WakeloomError(
      `dump/not-${promised}`,
      `not a ${promised} file: got first bytes ${hex(head)}, expected ${hex(FILE_MAGIC[promised])} (${name})`,
      { file: name },
    );
  }
  if (promised === 'text' && (hasMagic(head, FILE_MAGIC['utf-16 le']) || hasMagic(head, FILE_MAGIC['utf-16 be']))) {
    throw new WakeloomError(
      'dump/utf-16',
      `text encoding: got UTF-16, expected ASCII or UTF-8; save the file as UTF-8 (${name})`,
      { file: name },
    );
  }
  return promised;
}

function hex(bytes: ArrayLike<number>): string {
  return Array.from(bytes, (byte) => byte.toString(16).padStart(2, '0')).join(' ');
}
