import { spawnSync } from 'node:child_process';
import { fileURLToPath } from 'node:url';
import { seedFor } from '@wakeloom/tracker';
import type { WorkerClient } from '@wakeloom/tracker/workers/client';
import { buffersIn, buffersOf } from '@wakeloom/tracker/workers/transfer';
import { afterEach, describe, expect, it } from 'vitest';
import { type FaultOperations, startFaultWorker } from '../helpers/fault-operations.js';

const started: WorkerClient<FaultOperations>[] = [];

function start(options: { maxHeapMb?: number; graceMs?: number } = {}): WorkerClient<FaultOperations> {
  const client = startFaultWorker('faults', options);
  started.push(client);
  return client;
}

afterEach(async () => {
  await Promise.all(started.splice(0).map((client) => client.terminate()));
});

describe('a worker that fails', () => {
  it.each([
    ['crash-in-timer', 'worker/crashed', /thrown from a timer/],
    ['crash-in-promise', 'worker/crashed', /rejected and unhandled/],
  ] as const)('%s rejects the call and every other call in flight', async (operation, code, message) => {
    const client = start();
    const other = client.run('wait-then-name', { name: 'late', milliseconds: 60_000 });
    const call = client.run(operation, null);
    await expect(call).rejects.toMatchObject({ code, message: expect.stringMatching(message) });
    await expect(other).rejects.toMatchObject({ code });
    expect(client.pending).toBe(0);
    await expect(client.run('report', null)).rejects.toMatchObject({ code });
  });

  it('exits: the exit code reaches the caller', async () => {
    const client = start();
    await expect(client.run('exit', { exitCode: 7 })).rejects.toMatchObject({
      code: 'worker/exited',
      details: { exitCode: 7 },
    });
  });

  it('runs out of heap', async () => {
    const client = start({ maxHeapMb: 24 });
    await expect(client.run('exhaust-heap', null)).rejects.toMatchObject({ code: 'worker/out-of-memory' });
    expect(client.death?.code).toBe('worker/out-of-memory');
  });

  it('gets no memory for an array, and lives on', async () => {
    const client = start();
    for (const typed of [false, true]) {
      const call = client.run('exhaust-buffers', { typed });
      await expect(call).rejects.toMatchObject({ code: 'worker/out-of-memory' });
    }
    // A wrong length is no lack of memory.
    await expect(client.run('wrong-length', null)).rejects.toMatchObject({ code: 'run/unexpected' });
    await expect(client.run('spin', { milliseconds: 1, breathes: true })).resolves.toBeGreaterThan(0);
  });

  it('is ended on purpose', async () => {
    const client = start();
    const call = client.run('wait-then-name', { name: 'late', milliseconds: 60_000 });
    const rejected = expect(call).rejects.toMatchObject({ code: 'worker/exited' });
    await client.terminate();
    await rejected;
  });

  it('cannot be started', async () => {
    const { startNodeWorker } = await import('@wakeloom/tracker/node/threads');
    const { createWorkerClient } = await import('@wakeloom/tracker/workers/client');
    const handle = startNodeWorker({ entry: new URL('./no-such-worker.mjs', import.meta.url) });
    const client = createWorkerClient<FaultOperations>(handle);
    await expect(client.run('report', null)).rejects.toMatchObject({ code: 'worker/crashed' });
  });
});

describe('errors over the border', () => {
  it('keeps code, message and details of our errors', async () => {
    await expect(start().run('fail-coded', { row: 0 })).rejects.toMatchObject({
      name: 'WakeloomError',
      code: 'dump/empty',
      message: 'dump: got 0 rows, expected at least 1 (test)',
      details: { row: 0, list: [1, 'two'] },
    });
  });

  it('gives an unknown error the code run/unexpected and its own stack', async () => {
    await expect(start().run('fail-plain', null)).rejects.toMatchObject({
      code: 'run/unexpected',
      message: 'not a function of ours',
      stack: expect.stringContaining('fault-worker.mjs'),
    });
  });

  it('rejects values and arguments that cannot be sent, and lives on', async () => {
    const client = start();
    await expect(client.run('return-function', null)).rejects.toMatchObject({ code: 'worker/not-serialisable' });
    const unsendable = { row: (() => 1) as unknown as number };
    await expect(client.run('fail-coded', unsendable)).rejects.toMatchObject({ code: 'worker/not-serialisable' });
    await expect(client.run('spin', { milliseconds: 1, breathes: true })).resolves.toBeGreaterThan(0);
  });

  it('knows no other operations than those of the table', async () => {
    const call = start().run('toString' as 'report', null);
    await expect(call).rejects.toMatchObject({ code: 'worker/unknown-operation' });
  });
});

describe('transfer', () => {
  it('moves the buffer there and back', async () => {
    const numbers = Float64Array.of(1, 2, 3);
    const call = start().run('double-all', { numbers }, { transfer: buffersOf(numbers) });
    expect(numbers.length).toBe(0);
    expect(numbers.buffer.byteLength).toBe(0);
    expect((await call).doubled).toEqual(Float64Array.of(2, 4, 6));
  });

  it('copies what is not in the list', async () => {
    const numbers = Float64Array.of(1, 2, 3);
    await start().run('double-all', { numbers });
    expect(numbers).toEqual(Float64Array.of(1, 2, 3));
  });

  it('lists each buffer once and refuses a view of a part', () => {
    const numbers = new Float64Array(4);
    const bytes = new Uint8Array(numbers.buffer);
    expect(buffersIn({ numbers, bytes, count: 3, empty: new Int32Array(0) })).toEqual([numbers.buffer]);
    expect(() => buffersOf(numbers.subarray(1))).toThrow(expect.objectContaining({ code: 'worker/partial-transfer' }));
  });
});

describe('progress, events, limits', () => {
  it('forwards all events in order, and progress thinned but with its end', async () => {
    const notes: string[] = [];
    const steps: number[] = [];
    const value = await start().run('report', null, {
      bytes: 1234,
      threads: 3,
      seed: 9,
      onEvent: (event) => notes.push(event.message),
      onProgress: (stage, done, total, unit) => {
        expect([stage, total, unit]).toEqual(['count', 1000, 'frames']);
        steps.push(done);
      },
    });
    expect(notes).toEqual(Array.from({ length: 50 }, (_, i) => `note ${i}`));
    expect(steps[0]).toBe(1);
    expect(steps.at(-1)).toBe(1000);
    expect(steps.length).toBeLessThan(100);
    expect(value).toEqual({ bytes: 1234, threads: 3, seed: seedFor(9, 'a') });
  });

  it('flows while the worker computes', async () => {
    let settled = false;
    let during = 0;
    const call = start().run('spin', { milliseconds: 600, breathes: true }, { onProgress: () => settled || during++ });
    await call;
    settled = true;
    expect(during).toBeGreaterThanOrEqual(3);
  });
});

describe('abort', () => {
  it('rejects within 0.2 s and leaves the worker usable', async () => {
    const client = start();
    await client.run('spin', { milliseconds: 1, breathes: true });
    const delays: number[] = [];
    for (let i = 0; i < 5; i++) {
      const controller = new AbortController();
      let fired = 0;
      const call = client.run('spin', { milliseconds: 60_000, breathes: true }, { signal: controller.signal });
      setTimeout(() => {
        fired = performance.now();
        controller.abort();
      }, 60);
      await expect(call).rejects.toMatchObject({ code: 'run/aborted' });
      delays.push(performance.now() - fired);
    }
    console.log(`abort to rejection, ms: ${delays.map((delay) => delay.toFixed(0)).join(' ')}`);
    // The bar is 200 ms. Load from elsewhere only ever adds, so that the best of five stands for the program.
    expect(Math.min(...delays)).toBeLessThan(200);
    expect(client.death).toBeNull();
    await expect(client.run('spin', { milliseconds: 1, breathes: true })).resolves.toBeGreaterThan(0);
  });

  it('stops only the call it belongs to', async () => {
    const client = start();
    const controller = new AbortController();
    const stays = client.run('spin', { milliseconds: 300, breathes: true });
    const goes = client.run('wait-then-name', { name: 'x', milliseconds: 50 });
    const aborted = client.run('spin', { milliseconds: 60_000, breathes: true }, { signal: controller.signal });
    controller.abort();
    await expect(aborted).rejects.toMatchObject({ code: 'run/aborted' });
    await expect(goes).resolves.toMatchObject({ name: 'x' });
    await expect(stays).resolves.toBeGreaterThan(0);
  });

  it('ends a worker that does not look at messages, after the time of grace', async () => {
    const client = start({ graceMs: 150 });
    await client.run('spin', { milliseconds: 1, breathes: true });
    const controller = new AbortController();
    const call = client.run('spin', { milliseconds: 60_000, breathes: false }, { signal: controller.signal });
    const other = client.run('spin', { milliseconds: 1, breathes: true });
    const otherRejects = expect(other).rejects.toMatchObject({ code: 'worker/exited' });
    setTimeout(() => controller.abort(), 30);
    await expect(call).rejects.toMatchObject({ code: 'run/aborted' });
    await otherRejects;
    expect(client.death?.code).toBe('worker/exited');
  });

  it('does not wait for a worker that is still starting', async () => {
    const client = start();
    const controller = new AbortController();
    const call = client.run('spin', { milliseconds: 60_000, breathes: true }, { signal: controller.signal });
    controller.abort();
    // Nothing but this turn of the event loop: the worker cannot have answered.
    const first = await Promise.race([
      call.catch((error: { code: string }) => error.code),
      new Promise((resolve) => setImmediate(() => resolve('still waiting'))),
    ]);
    expect(first).toBe('run/aborted');
    // The call it got all the same ends at its first breath.
    await expect(client.run('spin', { milliseconds: 1, breathes: true })).resolves.toBeGreaterThan(0);
    expect(client.pending).toBe(0);
  });

  it('does not start what is aborted already', async () => {
    const call = start().run('spin', { milliseconds: 60_000, breathes: true }, { signal: AbortSignal.abort() });
    await expect(call).rejects.toMatchObject({ code: 'run/aborted' });
  });
});

describe('the process', () => {
  it('stays up for a call in flight and ends by itself after it, the worker still there', () => {
    // A fresh process on `dist`; were the idle worker to hold it up, the run would end at the time limit.
    const script = `
      import { startNodeWorker } from '@wakeloom/tracker/node/threads';
      import { createWorkerClient } from '@wakeloom/tracker/workers/client';
      const entry = new URL(${JSON.stringify(new URL('../helpers/fault-worker.mjs', import.meta.url).href)});
      const client = createWorkerClient(startNodeWorker({ entry }));
      const value = await client.run('wait-then-name', { name: 'done', milliseconds: 200 });
      console.log(value.name);`;
    const options = { encoding: 'utf8', timeout: 20_000, cwd: fileURLToPath(new URL('.', import.meta.url)) } as const;
    const ended = spawnSync(process.execPath, ['--input-type=module', '-e', script], options);
    expect(ended).toMatchObject({ status: 0, stdout: 'done\n', stderr: '' });
  });
});
