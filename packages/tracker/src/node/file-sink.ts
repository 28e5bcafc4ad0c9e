import { open } from 'node:fs/promises';
import type { ByteSink } from '../core/bytes.js';
import { writeError } from './file-errors.js';

/** A new file, or an old one emptied, written from its start; `close` brings it to the disk. Codes as in file-errors.ts. */
export async function openFileSink(path: string): Promise<ByteSink> {
  const guard = async <T>(work: () => Promise<T>, need = 0): Promise<T> => {
    try {
      return await work();
    } catch (error) {
      throw writeError(error, path, need);
    }
  };
  const handle = await guard(() => open(path, 'w'));
  return {
    write: (bytes) =>
      guard(async () => {
        let done = 0;
        while (done < bytes.length) done += (await handle.write(bytes, done, bytes.length - done)).bytesWritten;
      }, bytes.length),
    close: () =>
      guard(async () => {
        try {
          await handle.sync();
        } finally {
          await handle.close();
        }
      }),
  };
}
