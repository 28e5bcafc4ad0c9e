import { unpackSnappy } from '@wakeloom/tracker/detections/snappy';
import { expect, it } from 'vitest';

function unpack(packed: readonly number[], length: number): string {
  const into = new Uint8Array(length);
  unpackSnappy(Uint8Array.from(packed), into);
  return String.fromCharCode(...into);
}
const letters = (text: string) => [...text].map((letter) => letter.charCodeAt(0));

// Blocks built by hand from the format description: stated length, then literals (tag length - 1 << 2) and copies.
it('unpacks literals and copies of each kind', () => {
  expect(unpack([5, 4 << 2, ...letters('water')], 5)).toBe('water');
  // Copy of 4 from 2 back with a one-byte offset: overlaps what it writes.
  expect(unpack([6, 1 << 2, ...letters('ab'), 1, 2], 6)).toBe('ababab');
  // Copy of 3 from 3 back with a two-byte offset, and of 1 with a four-byte one.
  expect(unpack([7, 2 << 2, ...letters('abc'), (2 << 2) | 2, 3, 0, 3, 1, 0, 0, 0], 7)).toBe('abcabcc');
  // Literal whose length stands in one byte of its own.
  expect(unpack([70, 60 << 2, 69, ...letters('x'.repeat(70))], 70)).toBe('x'.repeat(70));
});

it.each([
  ['another length than stated', [4, 4 << 2, ...letters('water')], 5],
  ['a literal beyond the end', [5, 4 << 2, ...letters('wat')], 5],
  ['a copy from before the start', [5, 0, 119, 1, 2], 5],
  ['a copy of offset 0', [5, 0, 119, 1, 0], 5],
  ['more than stated', [2, 4 << 2, ...letters('water')], 2],
  ['less than stated', [6, 4 << 2, ...letters('water')], 6],
  ['a literal length of 2^32', [5, 63 << 2, 255, 255, 255, 255, ...letters('water')], 5],
  ['a stated length that never ends', [255, 255, 255, 255, 255, 255, 255], 5],
  ['nothing', [], 5],
])('refuses %s', (_, packed, length) => {
  expect(() => unpack(packed, length)).toThrow('damaged snappy block');
});
