import type { ColourMap } from './colour-map.js';

/**
 * A PNG picture with one byte a pixel: value 0 is transparent, value i is entry i - 1 of the colour map. Stored
 * without compression (a heat map of some thousand bins is small), so that no library is needed in Node or browser.
 * PNG specification, W3C Recommendation 2003 (ISO/IEC 15948), zlib RFC 1950, stored blocks RFC 1951 3.2.4.
 * @param pixels rows from the top, [width * height], borrowed
 */
export function palettePng(width: number, height: number, pixels: Uint8Array, map: ColourMap): Uint8Array {
  const header = new Uint8Array(13);
  const view = new DataView(header.buffer);
  view.setUint32(0, width);
  view.setUint32(4, height);
  // Bit depth 8, colour type 3 (palette); compression, filter and interlace methods 0.
  header.set([8, 3], 8);
  const palette = new Uint8Array(3 + map.length);
  palette.set(map, 3);
  return join([
    Uint8Array.of(0x89, 0x50, 0x4e, 0x47, 0x0d, 0x0a, 0x1a, 0x0a),
    chunk('IHDR', header),
    chunk('PLTE', palette),
    chunk('tRNS', Uint8Array.of(0)),
    chunk('IDAT', zlibStored(withFilterBytes(width, height, pixels))),
    chunk('IEND', new Uint8Array(0)),
  ]);
}

/** `data:` address of bytes. */
export function dataUri(bytes: Uint8Array, type = 'image/png'): string {
  return `data:${type};base64,${base64(bytes)}`;
}

function withFilterBytes(width: number, height: number, pixels: Uint8Array): Uint8Array {
  const rows = new Uint8Array((width + 1) * height);
  for (let row = 0; row < height; row++) {
    rows.set(pixels.subarray(row * width, (row + 1) * width), row * (width + 1) + 1);
  }
  return rows;
}

function zlibStored(bytes: Uint8Array): Uint8Array {
  const parts: Uint8Array[] = [Uint8Array.of(0x78, 0x01)];
  // At least one block, even when there is nothing to store.
  for (let from = 0; from === 0 || from < bytes.length; from += 0xffff) {
    const block = bytes.subarray(from, from + 0xffff);
    const last = from + 0xffff >= bytes.length ? 1 : 0;
    const size = block.length;
    parts.push(Uint8Array.of(last, size & 255, size >> 8, ~size & 255, (~size >> 8) & 255), block);
  }
  const sum = new Uint8Array(4);
  new DataView(sum.buffer).setUint32(0, adler32(bytes));
  parts.push(sum);
  return join(parts);
}

function adler32(bytes: Uint8Array): number {
  let a = 1;
  let b = 0;
  for (const byte of bytes) {
    a = (a + byte) % 65521;
    b = (b + a) % 65521;
  }
  return ((b << 16) | a) >>> 0;
}

function crc32(bytes: Uint8Array): number {
  let crc = 0xffffffff;
  for (const byte of bytes) {
    crc ^= byte;
    for (let bit = 0; bit < 8; bit++) crc = (crc >>> 1) ^ (crc & 1 ? 0xedb88320 : 0);
  }
  return (crc ^ 0xffffffff) >>> 0;
}

function chunk(type: string, data: Uint8Array): Uint8Array {
  const body = new Uint8Array(4 + data.length);
  for (let i = 0; i < 4; i++) body[i] = type.charCodeAt(i);
  body.set(data, 4);
  const framed = new Uint8Array(8 + body.length);
  const view = new DataView(framed.buffer);
  view.setUint32(0, data.length);
  framed.set(body, 4);
  view.setUint32(4 + body.length, crc32(body));
  return framed;
}

function join(parts: readonly Uint8Array[]): Uint8Array {
  const all = new Uint8Array(parts.reduce((sum, part) => sum + part.length, 0));
  let at = 0;
  for (const part of parts) {
    all.set(part, at);
    at += part.length;
  }
  return all;
}

function base64(bytes: Uint8Array): string {
  let binary = '';
  // In pieces: spreading a large array into one call overflows the stack.
  for (let i = 0; i < bytes.length; i += 0x2000) binary += String.fromCharCode(...bytes.subarray(i, i + 0x2000));
  return btoa(binary);
}
