import { createPool, type KernelRunner } from '@wakeloom/tracker/workers/pool';
import { buffersOf } from '@wakeloom/tracker/workers/transfer';
import { afterEach, describe, expect, it } from 'vitest';
import { type FaultOperations, startFaultWorker } from '../helpers/fault-operations.js';

const pools: KernelRunner<FaultOperations>[] = [];

function start(workers: number): KernelRunner<FaultOperations> {
  const pool = createPool(Array.from({ length: workers }, (_, i) => startFaultWorker(`faults ${i + 1}`)));
  pools.push(pool);
  return pool;
}

afterEach(async () => {
  await Promise.all(pools.splice(0).map((pool) => pool.terminate()));
});

describe('pool', () => {
  it('gives values in the order of the tasks, from all workers, with bounded tasks in flight', async () => {
    const pool = start(2);
    let taken = 0;
    let delivered = 0;
    let most = 0;
    async function* tasks() {
      for (let i = 0; i < 20; i++) {
        taken++;
        most = Math.max(most, taken - delivered);
        // Later tasks of a pair finish first: the order of answers is not the order of tasks.
        yield { args: { name: String(i), milliseconds: i % 2 === 0 ? 20 : 1 } };
      }
    }
    const names: string[] = [];
    const threads = new Set<number>();
    for await (const value of pool.mapOrdered('wait-then-name', tasks(), { limit: 4 })) {
      names.push(value.name);
      threads.add(value.thread);
      delivered++;
    }
    expect(names).toEqual(Array.from({ length: 20 }, (_, i) => String(i)));
    expect(threads.size).toBe(2);
    expect(most).toBe(4);
  });

  it('moves the buffers of its tasks', async () => {
    const pool = start(2);
    const sent: Float64Array[] = [];
    async function* tasks() {
      for (let i = 0; i < 6; i++) {
        const numbers = Float64Array.of(i);
        sent.push(numbers);
        yield { args: { numbers }, transfer: buffersOf(numbers) };
      }
    }
    const got: number[] = [];
    for await (const { doubled } of pool.mapOrdered('double-all', tasks())) got.push(doubled[0]);
    expect(got).toEqual([0, 2, 4, 6, 8, 10]);
    expect(sent.map((numbers) => numbers.length)).toEqual([0, 0, 0, 0, 0, 0]);
  });

  it('goes on without a dead worker', async () => {
    const pool = start(2);
    const crash = pool.run('exit', { exitCode: 3 });
    const others = Promise.all([1, 2, 3, 4].map((i) => pool.run('wait-then-name', { name: `${i}`, milliseconds: 20 })));
    await expect(crash).rejects.toMatchObject({ code: 'worker/exited' });
    const values = await others;
    expect(values.map((value) => value.name)).toEqual(['1', '2', '3', '4']);
    expect(new Set(values.map((value) => value.thread)).size).toBe(1);
  });

  it('rejects what waits when no worker is left', async () => {
    const pool = start(1);
    const crash = pool.run('exit', { exitCode: 3 });
    const waiting = pool.run('report', null);
    const waitingRejects = expect(waiting).rejects.toMatchObject({ code: 'worker/none-left' });
    await expect(crash).rejects.toMatchObject({ code: 'worker/exited' });
    await waitingRejects;
    await expect(pool.run('report', null)).rejects.toMatchObject({ code: 'worker/none-left' });
  });

  it('ends a stream at its first failure and closes the source', async () => {
    const pool = start(2);
    let closed = false;
    async function* tasks() {
      try {
        for (let row = 0; ; row++) yield { args: { row } };
      } finally {
        closed = true;
      }
    }
    const reading = (async () => {
      for await (const value of pool.mapOrdered('fail-coded', tasks())) expect.unreachable(String(value));
    })();
    await expect(reading).rejects.toMatchObject({ code: 'dump/empty', details: { row: 0 } });
    expect(closed).toBe(true);
  });

  it('aborts what is in flight when its reader stops', async () => {
    const pool = start(2);
    async function* tasks() {
      yield { args: { milliseconds: 1, breathes: true } };
      for (;;) yield { args: { milliseconds: 60_000, breathes: true } };
    }
    for await (const turns of pool.mapOrdered('spin', tasks())) {
      expect(turns).toBeGreaterThan(0);
      break;
    }
    // Had the long ones gone on, no worker would be free for these.
    const both = await Promise.all([pool.run('report', null), pool.run('report', null)]);
    expect(both).toHaveLength(2);
  });

  it('aborts on the signal of the caller', async () => {
    const pool = start(2);
    const controller = new AbortController();
    async function* tasks() {
      for (;;) yield { args: { milliseconds: 60_000, breathes: true } };
    }
    const reading = (async () => {
      for await (const value of pool.mapOrdered('spin', tasks(), { signal: controller.signal })) {
        expect.unreachable(String(value));
      }
    })();
    setTimeout(() => controller.abort(), 50);
    await expect(reading).rejects.toMatchObject({ code: 'run/aborted' });
  });
});
