import { closeSync, openSync, readSync, unlinkSync, writeSync } from 'node:fs';
import { join } from 'node:path';
import type { Scratch, ScratchFile } from '../core/bytes.js';
import { WakeloomError } from '../core/errors.js';
import { PARTIAL_PREFIX } from '../core/result-place.js';
import { writeError } from './file-errors.js';

/** Scratch files as `.partial-scratch-LABEL` in the folder. Codes: `store/disk-full`, `store/scratch-short`. */
export function nodeScratch(folder: string): Scratch {
  return {
    create(label): ScratchFile {
      const path = join(folder, `${PARTIAL_PREFIX}scratch-${label}`);
      let descriptor: number;
      try {
        descriptor = openSync(path, 'w+');
      } catch (error) {
        throw writeError(error, path);
      }
      let length = 0;
      return {
        get length() {
          return length;
        },
        append(bytes) {
          let done = 0;
          try {
            // A disk that fills takes a part and says so only at the next call.
            while (done < bytes.length) done += writeSync(descriptor, bytes, done, bytes.length - done, length + done);
          } catch (error) {
            throw writeError(error, path, bytes.length - done);
          }
          length += bytes.length;
        },
        read(position, into) {
          let done = 0;
          while (done < into.length) {
            const got = readSync(descriptor, into, done, into.length - done, position + done);
            if (got === 0) {
              const details = { path, position, wanted: into.length, got: done };
              const message = `scratch file: got ${done} bytes, expected ${into.length} (${path} at ${position}); something else changed the file, run again`;
              throw new WakeloomError('store/scratch-short', message, details);
            }
            done += got;
          }
        },
        discard() {
          if (descriptor < 0) return;
          closeSync(descriptor);
          descriptor = -1;
          unlinkSync(path);
        },
      };
    },
  };
}
