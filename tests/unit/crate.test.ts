import { pack, unpack } from '@wakeloom/tracker/workers/crate';
import { expect, it } from 'vitest';

const block = () => ({
  dims: 2,
  x: Float64Array.of(1.5, Number.NaN, -0),
  u: Float32Array.of(0.25, 3, 4).subarray(1),
  number: Int32Array.of(-7),
  offsets: Uint32Array.of(0, 3),
  flags: Uint16Array.of(1, 65535, 3),
  z: new Float64Array(0),
});

it('what is packed comes out the same, of any types and lengths', () => {
  const crate = pack(block(), []);
  expect(unpack(crate)).toEqual(block());
  expect(unpack<ReturnType<typeof block>>(crate).x.buffer).toBe(crate.buffer);
});

it('a spare buffer that is large enough is used, one that is not is dropped', () => {
  const large = new ArrayBuffer(4096);
  new Uint8Array(large).fill(255);
  const spares = [large, new ArrayBuffer(8)];
  const crate = pack(block(), spares);
  expect(crate.buffer).toBe(large);
  expect(spares).toEqual([]);
  expect(unpack(crate)).toEqual(block());
});
