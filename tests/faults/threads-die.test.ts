import { mkdtempSync, readdirSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { processInWorker } from '@wakeloom/tracker/node/process-in-worker';
import { startNodeWorker } from '@wakeloom/tracker/node/threads';
import { resolveRun } from '@wakeloom/tracker/run/resolve';
import { createWorkerClient } from '@wakeloom/tracker/workers/client';
import type { RunOperations } from '@wakeloom/tracker/workers/operation-table';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { stateOfFolder } from '../helpers/result-columns.js';
import { VORTEX_OPTIONS, vortexDump } from '../helpers/vortex-dump.js';

const folder = mkdtempSync(join(tmpdir(), 'threads-die-'));
const dump = join(folder, 'vortex.csv');
afterAll(() => rmSync(folder, { recursive: true, force: true }));

const RAM = 256 * 2 ** 20;
const request = () => ({
  resolved: resolveRun({ options: VORTEX_OPTIONS, dumpFiles: [dump] }),
  programVersion: 'test',
});
let digest: string;

// Four windows of at least 60 000 rows: each of two fitting threads gets a second one, at which it may die.
beforeAll(async () => {
  writeFileSync(dump, await vortexDump(130, 2000));
  const out = join(folder, 'undisturbed');
  digest = (await processInWorker(request(), [dump], out, { threads: 1, ramLimit: RAM })).digest.content;
}, 120_000);

/** A run whose threads die in the given manner; the error it rejects with. */
async function dyingRun(manner: string, out: string): Promise<{ code?: string; message?: string }> {
  const entry = new URL('../helpers/dying-worker.mjs', import.meta.url);
  process.env['DYING_MANNER'] = manner;
  const client = createWorkerClient<RunOperations>(startNodeWorker({ name: 'dying', entry }));
  const sources = [{ kind: 'path', path: dump } as const];
  try {
    await client.run('process', { request: request(), sources, out }, { threads: 3, bytes: RAM });
    return {};
  } catch (error) {
    return error as { code?: string };
  } finally {
    await client.terminate();
  }
}

describe('a thread that dies in the middle of a run', () => {
  it.each([
    ['helper-exit', 'worker/exited'],
    ['helper-crash', 'worker/crashed'],
    ['helper-memory', 'worker/out-of-memory'],
    ['coordinator-exit-before-writing', 'worker/exited'],
    ['coordinator-exit-before-rename', 'worker/exited'],
    ['coordinator-crash-in-sync', 'worker/crashed'],
  ])(
    '%s: ends the run with %s, leaves no result and does not stand in the way of a rerun',
    async (manner, code) => {
      const out = join(folder, manner);
      const error = await dyingRun(manner, out);
      expect(error.code).toBe(code);
      expect(error.message).toMatch(/got .*, expected /);
      expect(await stateOfFolder(out)).toBe('none');
      expect(readdirSync(out)).not.toContain('run.json');
      // A fitting thread's death is seen by the thread that owns the folder, which cleans up.
      if (manner.startsWith('helper')) expect(readdirSync(out)).toEqual([]);
      const again = await processInWorker(request(), [dump], out, { threads: 2, ramLimit: RAM });
      expect(again.digest.content).toBe(digest);
      expect(await stateOfFolder(out)).toBe('sound');
      expect(readdirSync(out).filter((file) => file.startsWith('.partial-'))).toEqual([]);
    },
    120_000,
  );
});
