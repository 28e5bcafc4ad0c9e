import { createHash } from 'node:crypto';
import { nodeHasher } from '@wakeloom/tracker/node/hasher';
import { folderDigest, openLedger } from '@wakeloom/tracker/store/digest';
import { canonicalBytes, integersFromBytes } from '@wakeloom/tracker/store/value-bytes';
import { describe, expect, it } from 'vitest';

const sha = (bytes: Uint8Array | string) => createHash('sha256').update(bytes).digest('hex');

describe('the content digest', () => {
  it('follows its written recipe byte for byte', () => {
    const ledger = openLedger(nodeHasher);
    const variable = ledger.variable('u', 'f32', [2], ['sample']);
    variable.update(new Uint8Array([0, 0, 128, 63]));
    variable.update(new Uint8Array([0, 0, 0, 64]));
    variable.end();
    ledger.dimension('sample', 2);
    ledger.attribute('u', 'units', 'mm/s');
    ledger.attribute('/', 'thinning', { type: 'i32', values: [10] });
    const lines = [
      `attribute / thinning i32 1 ${sha(new Uint8Array([10, 0, 0, 0]))}`,
      `attribute u units text 4 ${sha('mm/s')}`,
      'dimension sample 2',
      `variable u f32 2 sample ${sha(new Uint8Array([0, 0, 128, 63, 0, 0, 0, 64]))}`,
    ];
    expect(ledger.hex()).toBe(sha(lines.map((line) => `${line}\n`).join('')));
  });

  it('does not depend on the order of entries', () => {
    const hex = (names: string[]) => {
      const ledger = openLedger(nodeHasher);
      for (const name of names) ledger.attribute('/', name, name);
      return ledger.hex();
    };
    expect(hex(['a', 'b', 'c'])).toBe(hex(['c', 'a', 'b']));
    expect(hex(['a', 'b', 'c'])).not.toBe(hex(['a', 'b', 'd']));
    expect(folderDigest(nodeHasher, { b: '2', a: '1' })).toBe(sha('a 1\nb 2\n'));
  });
});

describe('bytes of values', () => {
  it('have one form of NaN', () => {
    const odd = new Float32Array(new Uint32Array([0xffc00000, 0x7f800001, 0x7fc12345, 0x3f800000, 0xff800000]).buffer);
    expect([...new Uint32Array(canonicalBytes(odd, 'f32').slice().buffer)]).toEqual([
      0x7fc00000, 0x7fc00000, 0x7fc00000, 0x3f800000, 0xff800000,
    ]);
    const wide = new Float64Array(new Uint32Array([1, 0xfff80000, 5, 0x7ff00000, 0, 0xbff00000]).buffer);
    expect([...new Uint32Array(canonicalBytes(wide, 'f64').slice().buffer)]).toEqual([
      0, 0x7ff80000, 0, 0x7ff80000, 0, 0xbff00000,
    ]);
  });

  it('hold whole numbers to 2^53 in 64 bits', () => {
    const values = [0, 1, -1, 2 ** 31, 2 ** 32 - 1, 2 ** 32, -(2 ** 32) - 7, 2 ** 53, -(2 ** 53)];
    const bytes = canonicalBytes(Float64Array.from(values), 'i64');
    expect([...new BigInt64Array(bytes.slice().buffer)]).toEqual(values.map(BigInt));
    expect([...integersFromBytes(bytes)]).toEqual(values);
  });
});
