import { mkdtempSync, readdirSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import type { RunEvent } from '@wakeloom/tracker';
import { createContext } from '@wakeloom/tracker';
import { nodeHasher, nodeHdf5, openFileSource, openNodeResultPlace } from '@wakeloom/tracker/node';
import { processInWorker } from '@wakeloom/tracker/node/process-in-worker';
import { processRun } from '@wakeloom/tracker/pipeline/process-run';
import { resolveRun } from '@wakeloom/tracker/run/resolve';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { VORTEX_OPTIONS, vortexDump } from '../helpers/vortex-dump.js';

const folder = mkdtempSync(join(tmpdir(), 'wakeloom-process-'));
const dump = join(folder, 'vortex.csv');
const MB = 1024 * 1024;

function request(files = [dump]) {
  const resolved = resolveRun({ options: VORTEX_OPTIONS, dumpFiles: files });
  return { resolved, programVersion: 'test' };
}

beforeAll(async () => {
  // 130 000 detections: more than two windows of 60 000 rows, so that helpers really share the work.
  writeFileSync(dump, await vortexDump(130, 1000));
});

afterAll(() => rmSync(folder, { recursive: true, force: true }));

// Whole runs, several a test: on a machine that does other work besides they take their time.
describe('a whole run in worker threads', { timeout: 240_000 }, () => {
  it('has the same content digest in this thread and with 1, 2 and 4 workers', async () => {
    const digests: string[] = [];
    for (const threads of [1, 2, 4]) {
      const out = join(folder, `threads-${threads}`);
      const record = await processInWorker(request(), [dump], out, { threads, ramLimit: 256 * MB });
      expect(record.host.threads).toBe(threads);
      expect(record.counts.samples).toBeGreaterThan(120_000);
      digests.push(record.digest.content);
    }
    const place = await openNodeResultPlace(join(folder, 'here'), { create: true });
    const source = await openFileSource(dump);
    const tools = {
      sources: [source],
      hdf5: nodeHdf5,
      hasher: nodeHasher,
      place,
      host: { name: 'test', platform: 'test', runtime: 'test' },
      clock: { now: () => '2000-01-01T00:00:00Z', seconds: () => 0 },
    };
    const { seed } = request().resolved.settings;
    const here = await processRun(request(), tools, createContext({ seed }));
    await source.close();
    expect(here.digest.content).toMatch(/^[0-9a-f]{64}$/);
    expect(digests).toEqual([here.digest.content, here.digest.content, here.digest.content]);
  });

  it('forwards progress of several stages and events while it runs', async () => {
    const stages = new Set<string>();
    const events: RunEvent[] = [];
    await processInWorker(request(), [dump], join(folder, 'watched'), {
      threads: 2,
      ramLimit: 256 * MB,
      onProgress: (stage) => stages.add(stage),
      onEvent: (event) => events.push(event),
    });
    expect(stages.size).toBeGreaterThanOrEqual(2);
    for (const event of events) expect(event.message.length).toBeGreaterThan(0);
  });

  it('brings coded errors of the pipeline back', async () => {
    const empty = join(folder, 'empty.csv');
    writeFileSync(empty, '');
    const run = processInWorker(request([empty]), [empty], join(folder, 'none'), { threads: 2, ramLimit: 256 * MB });
    await expect(run).rejects.toMatchObject({ code: 'dump/empty' });
    const missing = join(folder, 'missing.csv');
    const other = processInWorker(request([missing]), [missing], join(folder, 'none'), {
      threads: 1,
      ramLimit: 256 * MB,
    });
    await expect(other).rejects.toMatchObject({ code: 'dump/no-such-file' });
  });

  it.each([1, 2])('stops in every stage when asked, and leaves no result (%i workers)', async (threads) => {
    const delays: Record<string, number> = {};
    for (const wanted of ['read', 'link', 'fit', 'write']) {
      const out = join(folder, `aborted-${threads}-${wanted}`);
      const controller = new AbortController();
      let fired = 0;
      const run = processInWorker(request(), [dump], out, {
        threads,
        ramLimit: 256 * MB,
        signal: controller.signal,
        onProgress: (stage) => {
          if (fired > 0 || stage !== wanted) return;
          fired = performance.now();
          controller.abort();
        },
      });
      await expect(run).rejects.toMatchObject({ code: 'run/aborted' });
      delays[wanted] = Math.round(performance.now() - fired);
      expect(readdirSync(out)).toEqual([]);
    }
    console.log(`abort to rejection with ${threads} workers, ms:`, delays);
    // The bar is 200 ms on a machine that does nothing else. Load from elsewhere only adds, so that the best of the
    // four must keep it, and none may need the ending of a worker that did not answer (after 2000 ms).
    expect(Math.min(...Object.values(delays))).toBeLessThan(200);
    expect(Math.max(...Object.values(delays))).toBeLessThan(2000);
  });
});
