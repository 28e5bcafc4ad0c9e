import { createHash } from 'node:crypto';
import {
  existsSync,
  mkdirSync,
  mkdtempSync,
  readdirSync,
  readFileSync,
  rmSync,
  statSync,
  writeFileSync,
} from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { nodeHasher, nodeScratch, openFileSink, openFileSource, openNodeResultPlace } from '@wakeloom/tracker/node';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';

let folder: string;
beforeEach(() => {
  folder = mkdtempSync(join(tmpdir(), 'node-files-'));
});
afterEach(() => rmSync(folder, { recursive: true, force: true }));

describe('a file source', () => {
  it('reads anywhere and says how much at the end', async () => {
    const path = join(folder, 'a');
    writeFileSync(
      path,
      Uint8Array.from({ length: 100 }, (_, i) => i),
    );
    const source = await openFileSource(path);
    expect(source).toMatchObject({ name: path, size: 100, modified: statSync(path).mtime.toISOString() });
    const into = new Uint8Array(8);
    expect(await source.read(40, into)).toBe(8);
    expect([...into]).toEqual([40, 41, 42, 43, 44, 45, 46, 47]);
    expect(await source.read(96, into)).toBe(4);
    expect([...into.subarray(0, 4)]).toEqual([96, 97, 98, 99]);
    expect(await source.read(100, into)).toBe(0);
    await source.close();
  });

  it('tells a missing file from a folder', async () => {
    await expect(openFileSource(join(folder, 'none'))).rejects.toMatchObject({ code: 'dump/no-such-file' });
    await expect(openFileSource(folder)).rejects.toMatchObject({ code: 'dump/not-readable' });
  });
});

describe('a file sink', () => {
  it('writes in order over what was there', async () => {
    const path = join(folder, 'b');
    writeFileSync(path, 'something longer');
    const sink = await openFileSink(path);
    await sink.write(new TextEncoder().encode('one '));
    await sink.write(new TextEncoder().encode('two'));
    await sink.close();
    expect(readFileSync(path, 'utf8')).toBe('one two');
  });

  it('names the path it cannot make', async () => {
    const path = join(folder, 'no', 'such');
    await expect(openFileSink(path)).rejects.toMatchObject({ code: 'store/not-writable', details: { path } });
  });
});

describe('scratch files', () => {
  it('grow, read back, and are gone after discard', () => {
    const scratch = nodeScratch(folder).create('x');
    scratch.append(Uint8Array.of(1, 2, 3));
    scratch.append(Uint8Array.of(4, 5));
    expect(scratch.length).toBe(5);
    const into = new Uint8Array(3);
    scratch.read(2, into);
    expect([...into]).toEqual([3, 4, 5]);
    expect(() => scratch.read(3, into)).toThrowError(expect.objectContaining({ code: 'store/scratch-short' }));
    expect(readdirSync(folder)).toEqual(['.partial-scratch-x']);
    scratch.discard();
    scratch.discard();
    expect(readdirSync(folder)).toEqual([]);
  });
});

it('the hasher is SHA-256, whatever the pieces', () => {
  const hasher = nodeHasher();
  hasher.update(Uint8Array.of(97));
  hasher.update(Uint8Array.of(98, 99));
  // FIPS 180-2, appendix B.1.
  expect(hasher.hex()).toBe('ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad');
  expect(createHash('sha256').update('abc').digest('hex')).toMatch(/^ba7816bf/);
});

describe('a result place', () => {
  it('makes its folder and refuses a file in its stead', async () => {
    const path = join(folder, 'deep', 'result');
    await openNodeResultPlace(path, { create: true });
    expect(existsSync(path)).toBe(true);
    writeFileSync(join(folder, 'file'), '');
    for (const wrong of [join(folder, 'file'), join(folder, 'file', 'below')]) {
      await expect(openNodeResultPlace(wrong, { create: true })).rejects.toMatchObject({ code: 'store/not-a-folder' });
    }
  });

  it('lists, sizes, reads, renames and removes files', async () => {
    const place = await openNodeResultPlace(folder, { create: false });
    mkdirSync(join(folder, 'sub'));
    place.writeText('b', 'été');
    expect(place.files()).toEqual(['b', 'sub']);
    expect([place.size('b'), place.size('none')]).toEqual([5, -1]);
    await place.sync('b');
    place.rename('b', 'c');
    expect(place.readText('c')).toBe('été');
    place.remove('c');
    place.remove('c');
    expect(place.files()).toEqual(['sub']);
    expect(place.freeBytes()).toBeGreaterThan(0);
    expect(() => place.readText('c')).toThrowError(expect.objectContaining({ code: 'store/not-a-result' }));
    const nowhere = await openNodeResultPlace(join(folder, 'nowhere'), { create: false });
    expect(nowhere.files()).toEqual([]);
  });
});
