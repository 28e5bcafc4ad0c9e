import { metadataChecksum } from './metadata-checksum.js';

/** Where the values of a variable lie in the file, and its shape. */
export interface ValueArea {
  readonly shape: readonly number[];
  readonly position: number;
  readonly bytes: number;
}

/** Types of object header messages (HDF5 file format specification 3.0, section IV.A.2). */
const DATASPACE = 0x01;
const LAYOUT = 0x08;
const CONTINUATION = 0x10;
const SUPERBLOCK_BYTES = 48;

/** Where a header's two messages of interest stand in the file, and the blocks of the header with their checksums. */
interface DatasetHeader {
  dataspace: number;
  layout: number;
  /** First byte of each block and its checksum's place. */
  readonly blocks: { readonly start: number; readonly checksum: number }[];
}

/**
 * Gives datasets their values' place in a file that the HDF5 build has made and closed. The build makes a contiguous
 * dataset only from all its values at once, in its own memory; so it makes one of a single value, and here the header of
 * each gets the shape and the address it is to have. Their values are then written at those addresses as plain bytes.
 *
 * `file`: all bytes of the closed file, changed in place. Each of those datasets has rank `areas[i].shape.length`, every
 * size 1, and holds i as its one value (least significant byte first); that is how it is told which is which.
 * `end`: bytes of the file with all values. Follows the HDF5 file format specification 3.0: superblock version 2 or 3, object
 * headers version 2 (which datasets with tracked attribute order have), data layout versions 3 and 4. Anything else is a
 * fault of ours and throws.
 */
export function placeValues(file: Uint8Array, areas: readonly ValueArea[], end: number): void {
  const view = new DataView(file.buffer, file.byteOffset, file.byteLength);
  if (file[8] !== 2 && file[8] !== 3) throw new Error(`HDF5 file: got superblock version ${file[8]}, expected 2 or 3`);
  view.setBigUint64(28, BigInt(end), true);
  view.setUint32(SUPERBLOCK_BYTES - 4, metadataChecksum(file, 0, SUPERBLOCK_BYTES - 4), true);
  const placed = new Uint8Array(areas.length);
  for (let at = SUPERBLOCK_BYTES; at + 16 < file.length; at++) {
    // The signature of an object header, OHDR, which may also stand in a text: the checksum tells.
    if (view.getUint32(at, false) !== 0x4f484452 || file[at + 4] !== 2) continue;
    const header = readHeader(view, at);
    if (header === null || header.dataspace < 0 || header.layout < 0) continue;
    const index = placeholderIndex(view, header.layout);
    if (index < 0 || index >= areas.length || placed[index] === 1) continue;
    placed[index] = 1;
    setShape(view, header.dataspace, areas[index].shape);
    view.setBigUint64(header.layout + 2, BigInt(areas[index].position), true);
    view.setBigUint64(header.layout + 10, BigInt(areas[index].bytes), true);
    for (const { start, checksum } of header.blocks) {
      view.setUint32(checksum, metadataChecksum(file, start, checksum), true);
    }
  }
  const missing = placed.indexOf(0);
  if (missing >= 0) throw new Error(`HDF5 file: got no header of dataset ${missing}, expected one`);
}

/** The messages of a version 2 object header, continuation blocks included; null where the bytes are none. */
function readHeader(view: DataView, start: number): DatasetHeader | null {
  const flags = view.getUint8(start + 5);
  const sizeAt = start + 6 + (flags & 0x20 ? 16 : 0) + (flags & 0x10 ? 4 : 0);
  const sizeBytes = 1 << (flags & 3);
  if (sizeBytes > 4 || sizeAt + 4 > view.byteLength) return null;
  const size =
    sizeBytes === 1
      ? view.getUint8(sizeAt)
      : sizeBytes === 2
        ? view.getUint16(sizeAt, true)
        : view.getUint32(sizeAt, true);
  const header: DatasetHeader = { dataspace: -1, layout: -1, blocks: [] };
  const messages = sizeAt + sizeBytes;
  return readBlock(view, start, messages, messages + size, (flags & 4) !== 0, header) ? header : null;
}

function readBlock(
  view: DataView,
  start: number,
  messages: number,
  end: number,
  ordered: boolean,
  header: DatasetHeader,
): boolean {
  if (end + 4 > view.byteLength) return false;
  const bytes = new Uint8Array(view.buffer, view.byteOffset, view.byteLength);
  if (metadataChecksum(bytes, start, end) !== view.getUint32(end, true)) return false;
  header.blocks.push({ start, checksum: end });
  const prefix = ordered ? 6 : 4;
  for (let at = messages; at + prefix <= end; ) {
    const type = view.getUint8(at);
    const size = view.getUint16(at + 1, true);
    const data = at + prefix;
    if (type === DATASPACE) header.dataspace = data;
    else if (type === LAYOUT) header.layout = data;
    else if (type === CONTINUATION) {
      const next = Number(view.getBigUint64(data, true));
      const length = Number(view.getBigUint64(data + 8, true));
      if (!readBlock(view, next, next + 4, next + length - 4, ordered, header)) return false;
    }
    at = data + size;
  }
  return true;
}

/** The value that a contiguous dataset of one value holds, up to 4 bytes of it; -1 for any other layout. */
function placeholderIndex(view: DataView, layout: number): number {
  const version = view.getUint8(layout);
  if ((version !== 3 && version !== 4) || view.getUint8(layout + 1) !== 1) return -1;
  const position = Number(view.getBigUint64(layout + 2, true));
  const bytes = Number(view.getBigUint64(layout + 10, true));
  if (position + bytes > view.byteLength || bytes > 8) return -1;
  let index = 0;
  for (let i = Math.min(4, bytes) - 1; i >= 0; i--) index = index * 256 + view.getUint8(position + i);
  return index;
}

/** Current and largest sizes of a version 2 dataspace. */
function setShape(view: DataView, dataspace: number, shape: readonly number[]): void {
  const rank = view.getUint8(dataspace + 1);
  if (view.getUint8(dataspace) !== 2 || rank !== shape.length) {
    throw new Error(`HDF5 file: got a dataspace of rank ${rank}, expected version 2 and rank ${shape.length}`);
  }
  const withLargest = (view.getUint8(dataspace + 2) & 1) !== 0;
  for (const [k, size] of shape.entries()) {
    view.setBigUint64(dataspace + 4 + 8 * k, BigInt(size), true);
    if (withLargest) view.setBigUint64(dataspace + 4 + 8 * (rank + k), BigInt(size), true);
  }
}
