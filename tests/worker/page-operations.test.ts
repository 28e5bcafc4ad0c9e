import { createContext } from '@wakeloom/tracker';
import { nodeHasher, nodeHdf5 } from '@wakeloom/tracker/node';
import { resolveRun } from '@wakeloom/tracker/run/resolve';
import { loadWebHdf5 } from '@wakeloom/tracker/workers/hdf5-web';
import { type PagePlatform, pageBodies } from '@wakeloom/tracker/workers/page-operations';
import { blobSource } from '@wakeloom/tracker/workers/web-blob-source';
import { createMemoryResultPlace, type MemoryResultPlace } from '@wakeloom/tracker/workers/web-result-place';
import { beforeAll, describe, expect, it } from 'vitest';
import { VORTEX_OPTIONS, vortexDump } from '../helpers/vortex-dump.js';

// What a page's worker does, in this thread: the browser's HDF5 build runs in Node too, with its memory file system.

let dump: Blob;
const request = {
  resolved: resolveRun({ options: VORTEX_OPTIONS, dumpFiles: ['vortex.csv'] }),
  programVersion: 'test',
};

beforeAll(async () => {
  dump = new Blob([await vortexDump(40, 300)]);
});

function platform(limitBytes: number): PagePlatform {
  let last: MemoryResultPlace | null = null;
  return {
    openSource: async (ref) => {
      if (ref.kind !== 'blob') throw new Error('only blobs here');
      return blobSource(ref.blob, ref.name);
    },
    async openPlace(out) {
      last?.discard();
      last = createMemoryResultPlace(await loadWebHdf5(), nodeHasher, out, limitBytes);
      return last;
    },
    hasher: async () => nodeHasher,
    hdf5: async () => nodeHdf5,
    startHelper: () => {
      throw new Error('one thread is enough here');
    },
    host: { name: 'test', platform: 'test', runtime: 'test' },
    lastPlace: () => last,
  };
}

function process(where: PagePlatform) {
  const sources = [{ kind: 'blob', blob: dump, name: 'vortex.csv' } as const];
  return pageBodies.process({ request, sources, out: 'result' }, createContext(), where);
}

describe('a run in the memory of a page', () => {
  it('leaves all files, and a preview that holds every stride-th pathline', async () => {
    const where = platform(100_000_000);
    const { value: record } = await process(where);
    const { value: files } = await pageBodies.files(null, createContext(), where);
    expect(files.map(({ name }) => name)).toEqual([
      'frames.nc',
      'grid.nc',
      'log.ndjson',
      'pathlines.nc',
      'report.html',
      'run.json',
    ]);
    for (const { name, bytes } of files) {
      const { value, transfer } = await pageBodies.file({ name }, createContext(), where);
      expect(value.length).toBe(bytes);
      expect(transfer).toEqual([value.buffer]);
    }

    const all = (await pageBodies.preview({ most: Number.POSITIVE_INFINITY }, createContext(), where)).value;
    expect(all).toMatchObject({ stride: 1, pathlines: record.counts.pathlines, samples: record.counts.samples });
    expect(all.x.length).toBe(record.counts.samples);
    // Detections lie within the view of 64 mm x 48 mm, the dump's y pointing down.
    expect(Math.min(...all.x)).toBeGreaterThan(-1);
    expect(Math.max(...all.x)).toBeLessThan(65);
    expect(Math.max(...all.y)).toBeLessThan(1);

    const some = (await pageBodies.preview({ most: record.counts.samples / 3 }, createContext(), where)).value;
    expect(some.stride).toBe(3);
    const expected: number[] = [];
    let row = 0;
    all.rowSize.forEach((size, k) => {
      if (k % 3 === 0) expected.push(...all.speed.subarray(row, row + size));
      row += size;
    });
    expect([...some.speed]).toEqual(expected);
    // Both tests share the file system of the build: an earlier result would be kept by the run of the next one.
    where.lastPlace()?.discard();
  });

  it('keeps its limit in words that fit a page, and leaves no result', async () => {
    const where = platform(1_500_000);
    await expect(process(where)).rejects.toMatchObject({
      code: 'store/memory-full',
      message: expect.stringMatching(/wakeloom command/),
    });
    expect(where.lastPlace()?.files()).toEqual([]);
    expect(() => pageBodies.files(null, createContext(), where)).toThrow(
      expect.objectContaining({ code: 'store/not-a-result' }),
    );
  });
});
