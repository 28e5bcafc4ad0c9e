import type { Scratch, ScratchFile } from '../core/bytes.js';
import { WakeloomError } from '../core/errors.js';

/** Pieces that grow to this size before the next begins: large enough for few, small enough to waste little. */
const PIECE_BYTES = 4 * 1024 * 1024;

/**
 * Scratch files in memory, for browsers. All of them together hold at most `limitBytes`.
 *
 * @throws `store/scratch-full` from `append` beyond the limit, `store/scratch-short` from `read` past the end.
 */
export function createMemoryScratch(limitBytes: number): Scratch {
  let held = 0;
  return {
    create(label) {
      return createFile(
        label,
        (bytes) => {
          if (held + bytes > limitBytes) {
            throw new WakeloomError(
              'store/scratch-full',
              `working memory of the page: got ${held + bytes} bytes for "${label}", expected at most ${limitBytes}; process this run with the wakeloom command, which uses the disk, or choose fewer frames`,
              { label, bytes: held + bytes, limit: limitBytes },
            );
          }
          held += bytes;
        },
        (bytes) => {
          held -= bytes;
        },
      );
    },
  };
}

function createFile(label: string, take: (bytes: number) => void, giveBack: (bytes: number) => void): ScratchFile {
  let pieces: Uint8Array[] = [];
  let length = 0;
  return {
    get length() {
      return length;
    },
    append(bytes) {
      take(bytes.length);
      let done = 0;
      while (done < bytes.length) {
        const inPiece = length % PIECE_BYTES;
        const room = PIECE_BYTES - inPiece;
        const part = bytes.subarray(done, done + room);
        if (inPiece === 0) pieces.push(new Uint8Array(0));
        const last = pieces.length - 1;
        pieces[last] = grown(pieces[last], inPiece, part);
        length += part.length;
        done += part.length;
      }
    },
    read(position, into) {
      if (position < 0 || position + into.length > length) {
        throw new WakeloomError(
          'store/scratch-short',
          `scratch file "${label}": got a read of ${into.length} bytes at ${position}, expected an end within ${length}`,
          { label, position, bytes: into.length, length },
        );
      }
      let done = 0;
      while (done < into.length) {
        const from = (position + done) % PIECE_BYTES;
        const piece = pieces[Math.floor((position + done) / PIECE_BYTES)];
        const part = piece.subarray(from, Math.min(PIECE_BYTES, from + into.length - done));
        into.set(part, done);
        done += part.length;
      }
    },
    discard() {
      giveBack(length);
      pieces = [];
      length = 0;
    },
  };
}

/** The piece with `part` written at `used`; doubled, up to its full size, when it is too short. */
function grown(piece: Uint8Array, used: number, part: Uint8Array): Uint8Array {
  let target = piece;
  if (used + part.length > piece.length) {
    target = new Uint8Array(Math.min(PIECE_BYTES, Math.max(2 * piece.length, used + part.length)));
    target.set(piece.subarray(0, used));
  }
  target.set(part, used);
  return target;
}
