import type { ByteSource } from '../core/bytes.js';
import { WakeloomError } from '../core/errors.js';

/** A source over a Blob that also hands out the Blob itself, for readers that mount it (hdf5-web.ts). */
export interface BlobSource extends ByteSource {
  readonly blob: Blob;
}

/**
 * Bytes of a Blob or File, read piece by piece: nothing is kept in memory. A File gives its own name and
 * time of last change.
 *
 * @throws `dump/unreadable` from `read` when the file has changed or gone since it was chosen.
 */
export function blobSource(blob: Blob, name: string = blob instanceof File ? blob.name : 'data'): BlobSource {
  return {
    name,
    size: blob.size,
    modified: blob instanceof File ? new Date(blob.lastModified).toISOString() : null,
    blob,
    async read(position, into) {
      const end = Math.min(position + into.length, blob.size);
      if (position >= end) return 0;
      try {
        into.set(new Uint8Array(await blob.slice(position, end).arrayBuffer()));
      } catch (cause) {
        throw new WakeloomError(
          'dump/unreadable',
          `file "${name}": got a refusal at byte ${position} (${cause instanceof Error ? cause.message : String(cause)}), expected its bytes; choose the file again if it has changed`,
          { file: name, position },
          cause,
        );
      }
      return end - position;
    },
    close: () => Promise.resolve(),
  };
}
