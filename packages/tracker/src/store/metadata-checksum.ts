/**
 * Checksum of HDF5 metadata: Bob Jenkins' lookup3, `hashlittle` with the initial value 0 (public domain, 2006,
 * burtleburtle.net/bob/c/lookup3.c), as the HDF5 file format specification 3.0 names it in its object headers and
 * superblocks. Over bytes start .. end - 1; an unsigned 32-bit number.
 */
export function metadataChecksum(bytes: Uint8Array, start: number, end: number): number {
  let left = end - start;
  let a = (0xdeadbeef + left) | 0;
  let b = a;
  let c = a;
  let at = start;
  for (; left > 12; left -= 12, at += 12) {
    a = (a + word(bytes, at, 4)) | 0;
    b = (b + word(bytes, at + 4, 4)) | 0;
    c = (c + word(bytes, at + 8, 4)) | 0;
    a = (a - c) ^ rotate(c, 4);
    c = (c + b) | 0;
    b = (b - a) ^ rotate(a, 6);
    a = (a + c) | 0;
    c = (c - b) ^ rotate(b, 8);
    b = (b + a) | 0;
    a = (a - c) ^ rotate(c, 16);
    c = (c + b) | 0;
    b = (b - a) ^ rotate(a, 19);
    a = (a + c) | 0;
    c = (c - b) ^ rotate(b, 4);
    b = (b + a) | 0;
  }
  if (left === 0) return c >>> 0;
  a = (a + word(bytes, at, Math.min(4, left))) | 0;
  b = (b + word(bytes, at + 4, Math.min(4, left - 4))) | 0;
  c = (c + word(bytes, at + 8, Math.min(4, left - 8))) | 0;
  c = ((c ^ b) - rotate(b, 14)) | 0;
  a = ((a ^ c) - rotate(c, 11)) | 0;
  b = ((b ^ a) - rotate(a, 25)) | 0;
  c = ((c ^ b) - rotate(b, 16)) | 0;
  a = ((a ^ c) - rotate(c, 4)) | 0;
  b = ((b ^ a) - rotate(a, 14)) | 0;
  c = ((c ^ b) - rotate(b, 24)) | 0;
  return c >>> 0;
}

/** `count` bytes from the least significant on; 0 for none or fewer. */
function word(bytes: Uint8Array, at: number, count: number): number {
  let value = 0;
  for (let i = 0; i < count; i++) value |= bytes[at + i] << (8 * i);
  return value;
}

function rotate(value: number, bits: number): number {
  return (value << bits) | (value >>> (32 - bits));
}
