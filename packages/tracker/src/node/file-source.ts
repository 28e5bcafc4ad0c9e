import { open } from 'node:fs/promises';
import type { ByteSource } from '../core/bytes.js';
import { WakeloomError } from '../core/errors.js';
import { systemCode } from './file-errors.js';
import { rememberPath } from './source-paths.js';

/**
 * A file open for reading; `name` is the path as given. Codes: `dump/no-such-file`, `dump/not-readable`
 * (also for a folder).
 */
export async function openFileSource(path: string): Promise<ByteSource> {
  try {
    const handle = await open(path, 'r');
    const stat = await handle.stat();
    if (stat.isDirectory()) {
      await handle.close();
      throw Object.assign(new Error(`${path} is a folder`), { code: 'EISDIR' });
    }
    const source: ByteSource = {
      name: path,
      size: stat.size,
      modified: stat.mtime.toISOString(),
      async read(position, into) {
        let done = 0;
        while (done < into.length) {
          const { bytesRead } = await handle.read(into, done, into.length - done, position + done);
          if (bytesRead === 0) break;
          done += bytesRead;
        }
        return done;
      },
      close: () => handle.close(),
    };
    return rememberPath(source, path);
  } catch (error) {
    const code = systemCode(error) ?? 'an error';
    if (code === 'ENOENT') {
      const message = `input file: got no file of that name, expected a file (${path}); check the path`;
      throw new WakeloomError('dump/no-such-file', message, { path }, error);
    }
    const got = code === 'EISDIR' ? 'a folder' : code;
    const message = `input file: got ${got}, expected a file that can be read (${path}); check the path and its permissions`;
    throw new WakeloomError('dump/not-readable', message, { path, system: code }, error);
  }
}
