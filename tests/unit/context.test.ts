import { createContext, seedFor, toPlainError, WakeloomError } from '@wakeloom/tracker';
import { abortedError } from '@wakeloom/tracker/core/errors';
import { describe, expect, it } from 'vitest';

describe('run context', () => {
  it('derives seeds with the published FNV-1a offset and prime', () => {
    // Fowler, Noll, Vo: FNV-1a 32 bit of "a" is 0xe40c292c, of "foobar" 0xbf9cf968 (reference vectors of the authors).
    expect(seedFor(0, 'a')).toBe(0xe40c292c);
    expect(seedFor(0, 'foobar')).toBe(0xbf9cf968);
    expect(seedFor(1, 'a')).not.toBe(seedFor(2, 'a'));
  });

  it('throws the coded error at the next breath after an abort', async () => {
    const controller = new AbortController();
    const context = createContext({ signal: controller.signal });
    await context.breathe();
    controller.abort();
    expect(() => context.breathe()).toThrow(expect.objectContaining({ code: 'run/aborted' }));
  });

  it('keeps code and details in the plain form of an error', () => {
    const plain = toPlainError(new WakeloomError('dump/empty', 'the dump is empty', { file: 'a.csv' }));
    expect(plain).toMatchObject({ code: 'dump/empty', details: { file: 'a.csv' } });
    expect(toPlainError(new TypeError('x')).code).toBe('run/unexpected');
    expect(abortedError().code).toBe('run/aborted');
  });
});
