import { mkdtempSync, readdirSync, rmSync, truncateSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { type ByteSource, createContext } from '@wakeloom/tracker';
import { nodeHasher, nodeHdf5, openNodeResultPlace } from '@wakeloom/tracker/node';
import { processInWorker } from '@wakeloom/tracker/node/process-in-worker';
import { processRun } from '@wakeloom/tracker/pipeline/process-run';
import { resolveRun } from '@wakeloom/tracker/run/resolve';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { stateOfFolder } from '../helpers/result-columns.js';
import { VORTEX_OPTIONS, vortexDump } from '../helpers/vortex-dump.js';

const folder = mkdtempSync(join(tmpdir(), 'dump-changes-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));

const request = (files: string[]) => ({
  resolved: resolveRun({ options: VORTEX_OPTIONS, dumpFiles: files }),
  programVersion: 'test',
});
let bytes: Uint8Array;
let digest: string;

// About 3.5 MB, so that much is still to be read when the second reading has given its first block.
beforeAll(async () => {
  bytes = await vortexDump(100, 1500);
  digest = (await run(bytes, 'whole')).digest ?? '';
  expect(digest).toMatch(/^[0-9a-f]{64}$/);
}, 120_000);

/** A run whose dump holds `later` from the moment linking has begun. */
async function run(later: Uint8Array, name: string): Promise<{ code?: string; message?: string; digest?: string }> {
  const place = await openNodeResultPlace(join(folder, name), { create: true });
  let now = bytes;
  const source: ByteSource = {
    name: 'dump.csv',
    size: bytes.length,
    modified: null,
    async read(position, into) {
      const part = now.subarray(position, position + into.length);
      into.set(part);
      return part.length;
    },
    close: async () => {},
  };
  const context = createContext({
    onProgress: (stage) => {
      if (stage === 'link') now = later;
    },
  });
  const tools = {
    sources: [source],
    hdf5: nodeHdf5,
    hasher: nodeHasher,
    place,
    host: { name: 'test', platform: 'test', runtime: 'test' },
    clock: { now: () => '2000-01-01T00:00:00Z', seconds: () => 0 },
  };
  try {
    const record = await processRun(request(['dump.csv']), tools, context);
    return { digest: record.digest.content };
  } catch (error) {
    return error as { code?: string };
  }
}

/** The dump with its second half treated, length kept. */
function half(treat: (part: Uint8Array) => void): Uint8Array {
  const changed = bytes.slice();
  treat(changed.subarray(changed.length >> 1));
  return changed;
}

describe('a dump that something else changes while it is read', () => {
  it.each<[string, () => Uint8Array]>([
    ['cut to half', () => bytes.subarray(0, bytes.length >> 1)],
    ['cut to nothing', () => new Uint8Array(0)],
    ['overwritten with zeros', () => half((part) => part.fill(0))],
    ['begun anew', () => half((part) => part.set(bytes.subarray(0, part.length)))],
    ['written over with lines of text', () => half((part) => part.fill(0x61).fill(10, part.length - 1))],
    ['given other digits', () => half((part) => part.set(part.map((byte) => (byte === 0x31 ? 0x32 : byte))))],
  ])(
    '%s: ends with a coded error and no result',
    async (name, change) => {
      const out = name.replaceAll(' ', '-');
      const { code, message, digest: found } = await run(change(), out);
      expect(found).toBeUndefined();
      expect(code).toMatch(/^dump\//);
      expect(message).toMatch(/got .*, expected .*/);
      expect(readdirSync(join(folder, out))).toEqual([]);
    },
    60_000,
  );

  it('a file cut short under a running command leaves an error or, read whole before, the right result', async () => {
    const file = join(folder, 'cut.csv');
    writeFileSync(file, bytes);
    let cut = false;
    const out = join(folder, 'cut');
    const outcome = await processInWorker(request([file]), [file], out, {
      threads: 2,
      ramLimit: 256 * 2 ** 20,
      onProgress: (stage) => {
        if (stage !== 'link' || cut) return;
        cut = true;
        truncateSync(file, 1000);
      },
    }).then(
      (record) => record.digest.files,
      (error: { code?: string }) => error.code,
    );
    expect(cut).toBe(true);
    if (typeof outcome === 'string') {
      expect(outcome).toMatch(/^dump\//);
      expect(await stateOfFolder(out)).toBe('none');
    } else expect(await stateOfFolder(out)).toBe('sound');
  }, 60_000);
});
