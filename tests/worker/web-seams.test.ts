import { createHash } from 'node:crypto';
import { blobSource } from '@wakeloom/tracker/workers/web-blob-source';
import { createWebHasherFactory } from '@wakeloom/tracker/workers/web-hasher';
import { createMemoryScratch } from '@wakeloom/tracker/workers/web-scratch';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import { describe, expect, it } from 'vitest';

function seededBytes(count: number, seed: number): Uint8Array {
  const source = xoroshiro128plus(seed);
  return Uint8Array.from({ length: count }, () => source.next() & 0xff);
}

describe('web hasher', () => {
  it('agrees with node:crypto, hashers interleaved at uneven cuts', async () => {
    const make = await createWebHasherFactory();
    const texts = [seededBytes(10_000, 1), seededBytes(7777, 2), new Uint8Array(0)];
    const hashers = texts.map(() => make());
    const cuts = xoroshiro128plus(3);
    const done = [0, 0, 0];
    while (done[0] < texts[0].length || done[1] < texts[1].length) {
      for (const i of [0, 1]) {
        const step = (cuts.next() >>> 0) % 150;
        hashers[i].update(texts[i].subarray(done[i], done[i] + step));
        done[i] += step;
      }
    }
    const expected = texts.map((text) => createHash('sha256').update(text).digest('hex'));
    expect(hashers.map((hasher) => hasher.hex())).toEqual(expected);
    // FIPS 180-4 example: SHA-256 of "abc".
    const abc = make();
    abc.update(new TextEncoder().encode('abc'));
    expect(abc.hex()).toBe('ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad');
    expect(() => abc.hex()).toThrow(TypeError);
  });
});

describe('memory scratch', () => {
  it('reads back what was appended, across its inner pieces', () => {
    const file = createMemoryScratch(100_000_000).create('samples');
    const bytes = seededBytes(1_000_003, 4);
    for (let i = 0; i < 9; i++) file.append(bytes);
    expect(file.length).toBe(9 * bytes.length);
    const into = new Uint8Array(3 * bytes.length);
    const position = 4 * bytes.length - 17;
    file.read(position, into);
    const whole = new Uint8Array(9 * bytes.length);
    for (let i = 0; i < 9; i++) whole.set(bytes, i * bytes.length);
    expect(Buffer.compare(into, whole.subarray(position, position + into.length))).toBe(0);
  });

  it('keeps its limit over all files, and gives room back', () => {
    const scratch = createMemoryScratch(1000);
    const first = scratch.create('a');
    const second = scratch.create('b');
    first.append(new Uint8Array(600));
    expect(() => second.append(new Uint8Array(401))).toThrow(
      expect.objectContaining({ code: 'store/scratch-full', details: { label: 'b', bytes: 1001, limit: 1000 } }),
    );
    expect(second.length).toBe(0);
    first.discard();
    second.append(new Uint8Array(1000));
    expect(() => second.read(999, new Uint8Array(2))).toThrow(expect.objectContaining({ code: 'store/scratch-short' }));
  });
});

describe('blob source', () => {
  it('reads pieces, fewer bytes only at the end', async () => {
    const file = new File([Uint8Array.of(1, 2, 3, 4, 5)], 'dump.csv', { lastModified: 0 });
    const source = blobSource(file);
    expect([source.name, source.size, source.modified]).toEqual(['dump.csv', 5, '1970-01-01T00:00:00.000Z']);
    const into = new Uint8Array(4);
    expect(await source.read(3, into)).toBe(2);
    expect([...into]).toEqual([4, 5, 0, 0]);
    expect(await source.read(0, into)).toBe(4);
    expect([...into]).toEqual([1, 2, 3, 4]);
    expect(await source.read(5, into)).toBe(0);
  });
});
