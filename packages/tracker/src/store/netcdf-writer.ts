import type { RunContext } from '../core/context.js';
import { WakeloomError } from '../core/errors.js';
import type { Hdf5Type, NumericArray } from '../core/hdf5.js';
import type { PlaceFile, ResultPlace } from '../core/result-place.js';
import { PARTIAL_PREFIX } from '../core/result-place.js';
import { type AttributeValue, openLedger, TYPE_SIZE, type VariableDigest } from './digest.js';
import { checkRoom, diskFull } from './disk-space.js';
import { type AttributeTarget, createEmpty, createPlaceholder, writeAttribute } from './netcdf-datasets.js';
import { SIZE_ONLY } from './netcdf-names.js';
import { placeValues, type ValueArea } from './place-values.js';
import { readBackDigest } from './read-back.js';
import { canonicalBytes } from './value-bytes.js';

export type Attributes = Readonly<Record<string, AttributeValue>>;

/** How a variable is made. */
export interface VariableOptions {
  readonly name: string;
  readonly type: Hdf5Type;
  readonly dimensions: readonly string[];
  readonly attributes: Attributes;
}

/** Variables start at multiples of this many bytes: a page of memory, so that no page is written twice. */
const ALIGNMENT = 4096;

/** A NetCDF-4 file in the making, under its partial name. Dimensions and variables first, then values. */
export interface NetcdfWriter {
  dimension(name: string, size: number): void;
  /** A variable that bears the name of its only dimension is that dimension's coordinate. */
  variable(options: VariableOptions): void;
  /**
   * Appends rows; several calls must cover the variable exactly, in order. Borrows `values` until the promise settles;
   * calls need not wait for one another.
   */
  append(name: string, values: NumericArray): Promise<void>;
  /** Closes, syncs, reads back, compares; resolves to the content digest. The file keeps its partial name. */
  finish(context: RunContext): Promise<string>;
  /** Closes and removes the partial file. */
  abandon(): void;
}

interface OpenVariable {
  readonly type: Hdf5Type;
  readonly shape: readonly number[];
  readonly digests: readonly VariableDigest[];
  /** Values of one row, and rows written. */
  readonly rowValues: number;
  written: number;
  /** Where its values start in the file; known once all variables are. */
  position: number;
}

/**
 * Starts `file` in the folder. Values are little-endian, uncompressed, each variable in one piece: HDF5 makes
 * the file with all that is not values, is closed, and the values are written at their places as plain bytes (see
 * place-values.ts). Attribute order and dimension order are tracked, as the NetCDF-4 library needs for writing to the
 * file later.
 * Codes: `store/disk-full`, `store/read-back`, `store/not-writable`.
 */
export async function createNetcdf(place: ResultPlace, file: string, attributes: Attributes): Promise<NetcdfWriter> {
  const { hasher, checksum } = place;
  const hdf5 = await place.hdf5();
  const partial = PARTIAL_PREFIX + file;
  const ledger = openLedger(hasher);
  // The digest is taken once, of what is written; a cheaper sum holds what is read back against it.
  const check = checksum === undefined ? ledger : openLedger(checksum);
  const ledgers = checksum === undefined ? [ledger] : [ledger, check];
  const dimensions = new Map<string, { size: number; made: boolean }>();
  const variables = new Map<string, OpenVariable>();
  // Made by the place first, which says why when it cannot; HDF5 only prints.
  place.writeText(partial, '');
  const handle = new hdf5.File(place.hdf5Path(partial), 'w', { track_order: true });
  let open = true;
  let body: PlaceFile | null = null;
  let reserved = false;
  const underWay = new Set<Promise<void>>();
  let failure: { readonly error: unknown } | null = null;
  let placeholders = 0;
  let bytesWritten = 0;

  const put = (owner: string, attributes: Attributes) => {
    for (const [name, value] of Object.entries(attributes)) {
      // HDF5 has no text without characters.
      if (value === '') continue;
      writeAttribute(owner === '/' ? handle : (handle.get(owner) as AttributeTarget), name, value);
      for (const each of ledgers) each.attribute(owner, name, value);
    }
  };
  const closeMetadata = () => {
    if (!open) return;
    open = false;
    handle.close();
  };
  /** Ends what HDF5 writes and opens the file for values. */
  const beginValues = (): PlaceFile => {
    for (const [name, dimension] of dimensions) if (!dimension.made) makeScale(name);
    closeMetadata();
    const metadata = new Uint8Array(Math.max(0, place.size(partial)));
    const file = place.open(partial);
    body = file;
    file.read(0, metadata);
    let end = metadata.length;
    const areas: ValueArea[] = [];
    for (const variable of variables.values()) {
      const { type, shape, rowValues } = variable;
      const bytes = TYPE_SIZE[type] * rowValues * shape[0];
      if (bytes === 0) continue;
      variable.position = Math.ceil(end / ALIGNMENT) * ALIGNMENT;
      end = variable.position + bytes;
      areas.push({ shape, position: variable.position, bytes });
    }
    checkRoom(place, end - metadata.length);
    placeValues(metadata, areas, end);
    void write(file, 0, metadata);
    reserved = file.setSize(end);
    return file;
  };
  const write = (file: PlaceFile, position: number, bytes: Uint8Array): Promise<void> => {
    const done = file.write(position, bytes).finally(() => underWay.delete(done));
    underWay.add(done);
    // Whoever waits for it is told, and whoever calls `finish`.
    done.catch((error: unknown) => {
      failure ??= { error };
    });
    return done;
  };
  put('/', attributes);

  const writer: NetcdfWriter = {
    dimension: (name, size) => void dimensions.set(name, { size, made: false }),
    variable(options) {
      const { name, type } = options;
      const shape = options.dimensions.map((each) => {
        const dimension = dimensions.get(each);
        if (dimension === undefined) throw new Error(`netcdf: dimension ${each} of ${name} is not defined`);
        return dimension.size;
      });
      if (!open) throw new Error(`netcdf: variable ${name} comes after values`);
      const scale = options.dimensions.length === 1 && options.dimensions[0] === name;
      if (shape.includes(0)) createEmpty(hdf5, handle.file_id, name, type, shape);
      else createPlaceholder(hdf5, handle.file_id, name, type, shape.length, placeholders++);
      if (scale) {
        hdf5.module.set_scale(handle.file_id, `/${name}`, name);
        const own = dimensions.get(name);
        if (own !== undefined) own.made = true;
      } else {
        options.dimensions.forEach((each, index) => {
          makeScale(each);
          hdf5.module.attach_scale(handle.file_id, `/${name}`, `/${each}`, index);
        });
      }
      put(name, options.attributes);
      variables.set(name, {
        type,
        shape,
        digests: ledgers.map((each) => each.variable(name, type, shape, options.dimensions)),
        rowValues: shape.slice(1).reduce((product, size) => product * size, 1),
        written: 0,
        position: 0,
      });
    },
    append(name, values) {
      const variable = variables.get(name);
      if (variable === undefined) throw new Error(`netcdf: variable ${name} is not defined`);
      const bytes = canonicalBytes(values, variable.type);
      const rowBytes = variable.rowValues * TYPE_SIZE[variable.type];
      const rows = bytes.length / rowBytes;
      if (!Number.isInteger(rows) || variable.written + rows > variable.shape[0]) {
        throw new Error(`netcdf: ${name} got ${rows} rows after ${variable.written} of ${variable.shape[0]}`);
      }
      const file = body ?? beginValues();
      if (!reserved) checkRoom(place, bytes.length);
      const done = write(file, variable.position + variable.written * rowBytes, bytes);
      for (const digest of variable.digests) digest.update(bytes);
      variable.written += rows;
      bytesWritten += bytes.length;
      return done;
    },
    async finish(context) {
      const whole = body ?? beginValues();
      for (const [name, variable] of variables) {
        if (variable.written !== variable.shape[0]) {
          throw new Error(`netcdf: ${name} has ${variable.written} of ${variable.shape[0]} rows`);
        }
        for (const digest of variable.digests) digest.end();
      }
      await Promise.allSettled(underWay);
      if (failure !== null) throw failure.error;
      const expected = check.hex();
      whole.close();
      await place.sync(partial);
      const found = await readBackDigest(place, partial, context, checksum);
      if (found !== expected) throw readBackError(place, file, bytesWritten, expected, found);
      return ledger.hex();
    },
    abandon() {
      closeMetadata();
      body?.close();
      place.remove(partial);
    },
  };
  return writer;

  function makeScale(name: string): void {
    const dimension = dimensions.get(name);
    if (dimension === undefined || dimension.made) return;
    createEmpty(hdf5, handle.file_id, name, 'f32', [dimension.size]);
    hdf5.module.set_scale(handle.file_id, `/${name}`, SIZE_ONLY + String(dimension.size).padStart(10));
    for (const each of ledgers) each.dimension(name, dimension.size);
    dimension.made = true;
  }
}

/**
 * Why a file reads back otherwise than it was written: a disk without room for a megabyte more is full (the build hides
 * the failed writes), whatever it says of itself; otherwise code `store/read-back`.
 */
function readBackError(
  place: ResultPlace,
  file: string,
  bytes: number,
  expected: string,
  found: string,
): WakeloomError {
  const path = `${place.name}/${file}`;
  const probe = `${PARTIAL_PREFIX}probe`;
  try {
    place.writeText(probe, ' '.repeat(1 << 20));
  } catch (error) {
    if ((error as { code?: unknown }).code === 'store/disk-full') return diskFull(path, bytes, 0, error);
  } finally {
    place.remove(probe);
  }
  return new WakeloomError(
    'store/read-back',
    `result file read back: got content ${found.slice(0, 12)}, expected ${expected.slice(0, 12)} as written (${path}); the disk did not keep what was written, check it and run again`,
    { path, expected, found },
  );
}
