import type * as H5 from 'h5wasm';
import type { HasherFactory } from '../core/bytes.js';
import type { RunContext } from '../core/context.js';
import type { Hdf5Type } from '../core/hdf5.js';
import type { ResultPlace } from '../core/result-place.js';
import { type AttributeValue, BOOKKEEPING, type DigestLedger, openLedger, TYPE_SIZE } from './digest.js';
import { SIZE_ONLY } from './netcdf-names.js';

/** Bytes read at once. */
const WINDOW = 1 << 20;

/**
 * Content digest of a NetCDF file as it lies in the folder (recipe in digest.ts): what a file says, against what was
 * meant to be written. Reads every byte once, in a window of 1 MB. A file that cannot be opened gives `unreadable`.
 * `hasher`: another one, for a sum to compare with one taken in the same way.
 */
export async function readBackDigest(
  place: ResultPlace,
  file: string,
  context: RunContext,
  hasher: HasherFactory = place.hasher,
): Promise<string> {
  const hdf5 = await place.hdf5();
  const handle = new hdf5.File(place.hdf5Path(file), 'r');
  if (handle.file_id < 0n) return 'unreadable';
  let windowBytes = WINDOW;
  let window = hdf5.module._malloc(windowBytes);
  try {
    const ledger = openLedger(hasher);
    readAttributes(handle, '/', ledger);
    for (const name of handle.keys()) {
      const dataset = handle.get(name) as H5.Dataset;
      const { shape, size } = dataset.metadata;
      const type = hdf5TypeOf(dataset.metadata);
      if (shape === null || type === null) return 'unreadable';
      const scale = dataset.get_scale_name();
      if (scale?.startsWith(SIZE_ONLY)) {
        ledger.dimension(name, shape[0]);
        continue;
      }
      const dimensions = scale === null ? shape.map((_, i) => dataset.get_attached_scales(i)[0]?.slice(1)) : [name];
      const digest = ledger.variable(name, type, shape, dimensions);
      const rest = shape.slice(1);
      const rowBytes = size * rest.reduce((product, each) => product * each, 1);
      const step = Math.max(1, Math.floor(windowBytes / rowBytes));
      if (rowBytes > windowBytes) {
        hdf5.module._free(window);
        windowBytes = rowBytes;
        window = hdf5.module._malloc(windowBytes);
      }
      for (let row = 0; row < shape[0]; row += step) {
        const rows = Math.min(step, shape[0] - row);
        const count = [rows, ...rest].map(BigInt);
        const offset = count.map((_, i) => BigInt(i === 0 ? row : 0));
        const stride = count.map(() => 1n);
        // A read that fails must not leave the bytes of the window before it in place.
        hdf5.module.HEAPU8[window] ^= 0xff;
        hdf5.module.get_dataset_data(handle.file_id, `/${name}`, count, offset, stride, BigInt(window));
        digest.update(hdf5.module.HEAPU8.subarray(window, window + rows * rowBytes));
        await context.breathe();
      }
      digest.end();
      readAttributes(dataset, name, ledger);
    }
    return ledger.hex();
  } finally {
    hdf5.module._free(window);
    handle.close();
  }
}

/** Our name for an HDF5 number type, null for any we do not write. */
export function hdf5TypeOf(metadata: { type: number; size: number; signed: boolean }): Hdf5Type | null {
  const letter = metadata.type === 1 ? 'f' : metadata.type === 0 ? (metadata.signed ? 'i' : 'u') : null;
  const name = `${letter}${metadata.size * 8}`;
  return name in TYPE_SIZE ? (name as Hdf5Type) : null;
}

function readAttributes(owner: H5.Dataset | H5.File, ownerName: string, ledger: DigestLedger): void {
  for (const [name, attribute] of Object.entries(owner.attrs)) {
    if (BOOKKEEPING.has(name)) continue;
    const value = attribute.json_value;
    if (typeof value === 'string') {
      ledger.attribute(ownerName, name, value);
    } else {
      const type = hdf5TypeOf(attribute.metadata) ?? 'f64';
      const values = (Array.isArray(value) ? value : [value]).map(Number);
      ledger.attribute(ownerName, name, { type, values } satisfies AttributeValue);
    }
  }
}
