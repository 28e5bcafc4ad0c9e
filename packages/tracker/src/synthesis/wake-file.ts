import { WakeloomError } from '../core/errors.js';

/** Facts that stand in a wake file. Lengths in diameters of the cylinder, speeds over that of the stream. */
export interface WakeMeta {
  readonly what: string;
  /** Command that remakes the file. */
  readonly command: string;
  readonly reynolds: number;
  /** Shedding frequency times diameter over speed, from `cyclesMeasured` cycles of the lift. */
  readonly strouhal: number;
  /** Standard deviation of single cycles over their mean. */
  readonly strouhalSpread: number;
  readonly cyclesMeasured: number;
  readonly meanDragCoefficient: number;
  readonly rmsLiftCoefficient: number;
  readonly cellsPerDiameter: number;
  readonly machNumber: number;
  readonly domain: { readonly upstream: number; readonly downstream: number; readonly width: number };
  /** Diameter over the width of the computed domain. */
  readonly blockage: number;
  /** A coarse lattice in the same width and in a wider one: what the width does to the frequency. */
  readonly coarse: {
    readonly cellsPerDiameter: number;
    readonly strouhal: number;
    readonly wideWidth: number;
    readonly wideStrouhal: number;
  };
  /** Root mean square departure of the computed field from the wake's own symmetry, over the stream's speed. */
  readonly asymmetry: number;
  /** x of the first node, nodes a diameter, nodes along x and along y (y = 0 first). */
  readonly left: number;
  readonly perDiameter: number;
  readonly across: number;
  readonly rows: number;
  readonly harmonics: number;
}

/** A wake file in memory. */
export interface WakeData {
  readonly meta: WakeMeta;
  /**
   * Velocity over the stream's speed in the upper half plane, a field of rows x across for each of: mean u, mean v,
   * then for harmonic 1, 2, ... cos u, cos v, sin u, sin v. Phase 0: the lift crosses zero upwards.
   */
  readonly fields: readonly Float32Array[];
}

const MAGIC = 'wakeloom wake 1\n';
/** One count of the stored whole numbers, over the stream's speed: 2^-14 spans +-2 speeds. */
const COUNT = 2 ** -14;

/**
 * File bytes before compression: 16 bytes of magic, the length of the metadata (uint32, little-endian), the metadata
 * as UTF-8 JSON padded with blanks to an even length, then int16 little-endian, field after field, y slowest, in
 * counts of 2^-14 of the stream's speed (rounding error at most 3.1e-5 of it). Throws `usage/wake-field` for values
 * beyond +-2.
 */
export function encodeWake(meta: WakeMeta, fields: readonly ArrayLike<number>[]): Uint8Array {
  let json = JSON.stringify(meta);
  while (new TextEncoder().encode(json).length % 2 !== 0) json += ' ';
  const head = new TextEncoder().encode(json);
  const start = MAGIC.length + 4 + head.length;
  const values = meta.across * meta.rows;
  const bytes = new Uint8Array(start + 2 * values * fields.length);
  const view = new DataView(bytes.buffer);
  bytes.set(new TextEncoder().encode(MAGIC));
  view.setUint32(MAGIC.length, head.length, true);
  bytes.set(head, MAGIC.length + 4);
  let at = start;
  for (const field of fields) {
    for (let k = 0; k < values; k++, at += 2) {
      if (!(Math.abs(field[k]) < 2 - COUNT)) {
        throw new WakeloomError(
          'usage/wake-field',
          `wake field: got ${field[k]}, expected at most 2 speeds of the stream`,
        );
      }
      view.setInt16(at, Math.round(field[k] / COUNT), true);
    }
  }
  return bytes;
}

/** Reads a wake file, gzip-compressed or not. Throws `usage/wake-file` when it is none or is cut short. */
export async function decodeWake(file: Uint8Array): Promise<WakeData> {
  const bytes = file[0] === 0x1f && file[1] === 0x8b ? await gunzip(file) : file;
  const wrong = (found: string) =>
    new WakeloomError(
      'usage/wake-file',
      `wake field: got ${found}, expected a whole file such as data/wake-re150.bin.gz`,
    );
  if (new TextDecoder().decode(bytes.subarray(0, MAGIC.length)) !== MAGIC) throw wrong('bytes without its magic');
  const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
  const start = MAGIC.length + 4 + view.getUint32(MAGIC.length, true);
  const meta = JSON.parse(new TextDecoder().decode(bytes.subarray(MAGIC.length + 4, start))) as WakeMeta;
  const values = meta.across * meta.rows;
  const count = 2 * (1 + 2 * meta.harmonics);
  if (bytes.length !== start + 2 * values * count) throw wrong(`${bytes.length} bytes`);
  const fields = Array.from({ length: count }, (_, f) => {
    const field = new Float32Array(values);
    for (let k = 0; k < values; k++) field[k] = COUNT * view.getInt16(start + 2 * (f * values + k), true);
    return field;
  });
  return { meta, fields };
}

async function gunzip(file: Uint8Array): Promise<Uint8Array> {
  const stream = new Blob([file as Uint8Array<ArrayBuffer>]).stream().pipeThrough(new DecompressionStream('gzip'));
  return new Uint8Array(await new Response(stream).arrayBuffer());
}
