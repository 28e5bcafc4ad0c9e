import type * as H5 from 'h5wasm';
import { WakeloomError } from '../core/errors.js';
import type { Hdf5Dataset, Hdf5Reader, NumericArray } from '../core/hdf5.js';
import type { Hdf5Build } from '../core/result-place.js';
import { decodeNumbers, type NumberLayout, numberLayout } from './number-layout.js';

/**
 * Opens an HDF5 file that the build sees under `path` for reading; `name` is for messages, `onClose` runs after it is
 * closed. Numbers of 1 to 8 bytes, both byte orders, plain or as members of compound tables; 64-bit integers come as
 * Float64 (exact to 2^53). Code `dump/not-hdf5` when the bytes are no HDF5 file.
 */
export function openHdf5Reader(
  build: Hdf5Build,
  path: string,
  name: string,
  onClose: () => void = () => {},
): Hdf5Reader {
  const file = new build.File(path, 'r');
  if (file.file_id < 0n) {
    const message = `HDF5 file: got bytes that are not HDF5, expected an HDF5 file (${name}); check the file or give its format`;
    throw new WakeloomError('dump/not-hdf5', message, { path: name });
  }
  let open = true;
  return {
    datasets(group = '/') {
      const found: string[] = [];
      const prefix = group === '/' ? '' : `/${group.replace(/^\/+|\/+$/g, '')}`;
      const top = prefix === '' ? file : file.get(prefix);
      if (top === null || !('paths' in top)) return found;
      for (const below of top.paths()) {
        const full = `${prefix}/${below.replace(/^\/+/, '')}`;
        found.push(...numericPaths(file.get(full), full));
      }
      return found.sort();
    },
    dataset: (wanted) => openDataset(build, file, wanted),
    attribute: (wanted) => attributeOf(file, wanted),
    close() {
      if (!open) return;
      open = false;
      file.close();
      onClose();
    },
  };
}

type Entity = H5.Entity | null;

function isDataset(entity: Entity): entity is H5.Dataset {
  return entity !== null && 'slice' in entity;
}

function numericPaths(entity: Entity, path: string): string[] {
  if (!isDataset(entity)) return [];
  const { metadata } = entity;
  if (metadata.compound_type !== undefined) {
    return metadata.compound_type.members
      .filter((member) => numberLayout(member) !== null)
      .map((member) => `${path}:${member.name}`);
  }
  return numberLayout(metadata) === null ? [] : [path];
}

function openDataset(build: Hdf5Build, file: H5.File, wanted: string): Hdf5Dataset | null {
  const path = wanted.startsWith('/') ? wanted : `/${wanted}`;
  let entity = getOrNull(file, path);
  let member: string | null = null;
  if (!isDataset(entity)) {
    const colon = path.lastIndexOf(':');
    if (colon < 0) return null;
    member = path.slice(colon + 1);
    entity = getOrNull(file, path.slice(0, colon));
    if (!isDataset(entity)) return null;
  }
  const dataset = entity;
  const { metadata } = dataset;
  const shape = metadata.shape;
  if (shape === null) return null;
  const part = member === null ? metadata : metadata.compound_type?.members.find((each) => each.name === member);
  const layout = part === undefined ? null : numberLayout(part);
  if (part === undefined || layout === null) return null;
  // The build turns plain big-endian numbers round on reading, members of tables it leaves as they are.
  const inMemory = member === null ? { ...layout, littleEndian: true } : layout;
  const offset = 'offset' in part ? (part.offset as number) : 0;
  return {
    path,
    shape,
    rows: (start, end) => readRows(build, file, dataset, { ...inMemory, offset, stride: metadata.size }, start, end),
    attribute: (name) => attributeOf(dataset, name),
  };
}

function getOrNull(file: H5.File, path: string): Entity {
  return file.get(path);
}

function readRows(
  build: Hdf5Build,
  file: H5.File,
  dataset: H5.Dataset,
  layout: NumberLayout & { readonly offset: number; readonly stride: number },
  start: number,
  end: number,
): NumericArray {
  const shape = dataset.metadata.shape ?? [];
  const rows = shape.length === 0 ? 1 : Math.max(0, Math.min(end, shape[0]) - start);
  const count = shape.length === 0 ? 1 : [rows, ...shape.slice(1)].reduce((product, size) => product * size, 1);
  if (count === 0) return decodeNumbers(new Uint8Array(0), layout, 0);
  const { module } = build;
  const bytes = count * layout.stride;
  const address = module._malloc(bytes);
  if (address === 0)
    throw new WakeloomError(
      'run/out-of-memory',
      `HDF5 read: got no memory for ${bytes} bytes, expected it (${dataset.path})`,
      { bytes },
    );
  try {
    const selection = shape.length === 0 ? null : [rows, ...shape.slice(1)].map(BigInt);
    const offset = selection?.map((_, index) => BigInt(index === 0 ? start : 0)) ?? null;
    const strides = selection?.map(() => 1n) ?? null;
    module.get_dataset_data(file.file_id, dataset.path, selection, offset, strides, BigInt(address));
    return decodeNumbers(module.HEAPU8.subarray(address, address + bytes), layout, count);
  } finally {
    module._free(address);
  }
}

/** Text, a number, or numbers; null when it is not there or of another kind. */
export function attributeOf(owner: H5.File | H5.Dataset, name: string): string | number | readonly number[] | null {
  const attribute = owner.attrs[name];
  if (attribute === undefined) return null;
  const value = attribute.json_value;
  if (typeof value === 'string' || typeof value === 'number') return value;
  if (!Array.isArray(value)) return null;
  if (value.length === 1 && (typeof value[0] === 'string' || typeof value[0] === 'number')) return value[0];
  return value.every((each) => typeof each === 'number') ? value : null;
}
