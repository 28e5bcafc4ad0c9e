import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { createContext } from '@wakeloom/tracker';
import type { Hdf5Type } from '@wakeloom/tracker/core/hdf5';
import { PARTIAL_PREFIX, type ResultPlace } from '@wakeloom/tracker/core/result-place';
import { openNodeResultPlace } from '@wakeloom/tracker/node/result-place-node';
import { openHdf5Reader } from '@wakeloom/tracker/store/hdf5-reader';
import { metadataChecksum } from '@wakeloom/tracker/store/metadata-checksum';
import { createNetcdf } from '@wakeloom/tracker/store/netcdf-writer';
import { placeValues } from '@wakeloom/tracker/store/place-values';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';

let folder: string;
let place: ResultPlace;

beforeEach(async () => {
  folder = mkdtempSync(join(tmpdir(), 'netcdf-writer-'));
  place = await openNodeResultPlace(folder, { create: true });
});
afterEach(() => rmSync(folder, { recursive: true, force: true }));

describe('checksum of HDF5 metadata', () => {
  it.each([
    // Bob Jenkins, lookup3.c (2006), driver5.
    ['', 0xdeadbeef],
    ['Four score and seven years ago', 0x17770551],
  ])('of "%s"', (text, expected) => {
    const bytes = new TextEncoder().encode(`..${text}..`);
    expect(metadataChecksum(bytes, 2, bytes.length - 2)).toBe(expected);
  });
});

const TYPES: readonly Hdf5Type[] = ['f64', 'f32', 'i32', 'i64', 'u16', 'u8'];

describe('a NetCDF file', () => {
  it('gives back variables of every type and rank, however their values were handed in', async () => {
    const file = await createNetcdf(place, 'made.nc', { title: 'OHDR\u0002 is no header here' });
    const sizes = [5, 3, 4];
    ['a', 'b', 'c'].forEach((name, k) => {
      file.dimension(name, sizes[k]);
    });
    file.dimension('nothing', 0);
    const made = TYPES.flatMap((type) =>
      [1, 2, 3].map((rank) => {
        const dimensions = ['a', 'b', 'c'].slice(0, rank);
        const count = sizes.slice(0, rank).reduce((product, size) => product * size, 1);
        const values = Float64Array.from({ length: count }, (_, i) => (7 * i + rank) % 251);
        return { name: `${type}_${rank}`, type, rank, dimensions, values, count };
      }),
    );
    for (const { name, type, dimensions } of made) {
      // More than eight attributes: HDF5 then keeps them elsewhere than in the header.
      const attributes = Object.fromEntries(Array.from({ length: 12 }, (_, k) => [`note_${k}`, `OHDR ${name} ${k}`]));
      file.variable({ name, type, dimensions, attributes });
    }
    file.variable({ name: 'empty', type: 'f32', dimensions: ['nothing'], attributes: { units: '1' } });
    // Two rows, then the rest, in turn with other variables.
    await Promise.all(made.map(({ name, values, count }) => file.append(name, values.slice(0, (2 * count) / 5))));
    await Promise.all(made.map(({ name, values, count }) => file.append(name, values.slice((2 * count) / 5))));
    await file.finish(createContext());

    const path = place.hdf5Path(`${PARTIAL_PREFIX}made.nc`);
    const reader = openHdf5Reader(await place.hdf5(), path, 'made.nc');
    for (const { name, dimensions, values } of made) {
      const dataset = reader.dataset(name);
      expect(dataset?.shape, name).toEqual(sizes.slice(0, dimensions.length));
      expect([...(dataset?.rows(0, 5) ?? [])].map(Number), name).toEqual([...values]);
      expect(dataset?.attribute('note_11')).toBe(`OHDR ${name} 11`);
    }
    expect(reader.dataset('empty')?.shape).toEqual([0]);
    reader.close();
  });

  it('that lost a value on the disk does not pass', async () => {
    const file = await createNetcdf(place, 'made.nc', {});
    file.dimension('row', 1000);
    file.variable({ name: 'value', type: 'i32', dimensions: ['row'], attributes: {} });
    await file.append('value', new Int32Array(1000).fill(0x01020304));
    const path = place.hdf5Path(`${PARTIAL_PREFIX}made.nc`);
    const bytes = readFileSync(path);
    bytes[bytes.length - 1] ^= 1;
    writeFileSync(path, bytes);
    await expect(file.finish(createContext())).rejects.toMatchObject({ code: 'store/read-back' });
    file.abandon();
  });

  it('is refused where its headers are not what is expected', async () => {
    const file = await createNetcdf(place, 'made.nc', {});
    file.dimension('row', 2);
    file.variable({ name: 'value', type: 'i32', dimensions: ['row'], attributes: {} });
    await file.append('value', Int32Array.of(1, 2));
    await file.finish(createContext());
    const bytes = readFileSync(place.hdf5Path(`${PARTIAL_PREFIX}made.nc`));
    const area = { shape: [2], position: 8192, bytes: 8 };
    // Its one dataset has its values already: no placeholder is left.
    expect(() => placeValues(bytes, [area, area], 8200)).toThrow(/got no header of dataset/);
    bytes[8] = 0;
    expect(() => placeValues(bytes, [area], 8200)).toThrow(/superblock version 0/);
  });
});
