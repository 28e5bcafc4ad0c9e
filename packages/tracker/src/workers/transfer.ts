import { WakeloomError } from '../core/errors.js';

/**
 * Buffers behind typed arrays, for the transfer list of a call or result; the sender must drop the arrays in
 * the same statement. A buffer named twice stands once in the list (twice would throw when sent).
 *
 * @throws `worker/partial-transfer` when an array shows only part of its buffer: moving it would detach every
 *   other view of that buffer. Copy it with `slice()` first.
 */
export function buffersOf(...arrays: readonly ArrayBufferView[]): ArrayBuffer[] {
  const buffers = new Set<ArrayBuffer>();
  for (const array of arrays) {
    if (!(array.buffer instanceof ArrayBuffer)) {
      throw new WakeloomError(
        'worker/partial-transfer',
        'transfer list: got a shared buffer, expected one that moves',
        {},
      );
    }
    if (array.byteLength !== array.buffer.byteLength) {
      throw new WakeloomError(
        'worker/partial-transfer',
        `transfer list: got a view of ${array.byteLength} of ${array.buffer.byteLength} bytes, expected a view of a whole buffer; copy it with slice() first`,
        { viewBytes: array.byteLength, bufferBytes: array.buffer.byteLength },
      );
    }
    // An empty buffer has nothing to move, and several empty columns may share one.
    if (array.byteLength > 0) buffers.add(array.buffer);
  }
  return [...buffers];
}

/** Buffers of every typed array directly inside an object of columns, such as a block. See `buffersOf`. */
export function buffersIn(columns: object): ArrayBuffer[] {
  return buffersOf(...Object.values(columns).filter((value): value is ArrayBufferView => ArrayBuffer.isView(value)));
}
