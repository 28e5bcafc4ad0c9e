import type { RunContext } from '../core/context.js';
import { WakeloomError } from '../core/errors.js';
import type { ResultPlace } from '../core/result-place.js';
import { folderDigest } from './digest.js';
import { readBackDigest } from './read-back.js';
import { placeFiles, readRunRecord } from './result-files.js';

/**
 * Reads every value of a finished result's NetCDF files and holds their digests against run.json: a bit that flipped
 * on the disk since, or a file of another run, shows here and nowhere else. Reads each byte once.
 * report.html and log.ndjson carry no data and have no digest. Codes: `store/digest-differs`, those of
 * `readRunRecord`, `run/aborted`.
 */
export async function verifyResult(place: ResultPlace, context: RunContext): Promise<void> {
  const { digest } = await readRunRecord(placeFiles(place));
  const files = Object.entries(digest.files);
  for (const [done, [file, expected]] of files.entries()) {
    context.progress('verify', done, files.length, 'files');
    const found = await digestOf(place, file, context);
    if (found !== expected) throw differs(`${place.name}/${file}`, found, expected);
  }
  const content = folderDigest(place.hasher, digest.files);
  if (content !== digest.content) throw differs(`${place.name}/run.json`, content, digest.content);
  context.progress('verify', files.length, files.length, 'files');
}

/** The digest, or `unreadable` where damage keeps the HDF5 build from walking through the file at all. */
async function digestOf(place: ResultPlace, file: string, context: RunContext): Promise<string> {
  try {
    return await readBackDigest(place, file, context);
  } catch (error) {
    if (context.signal.aborted) throw error;
    return 'unreadable';
  }
}

function differs(path: string, found: string, expected: string): WakeloomError {
  return new WakeloomError(
    'store/digest-differs',
    `result file: got content ${found.slice(0, 12)}, expected ${expected.slice(0, 12)} as run.json says (${path}); the file was damaged or changed after the run, process the run again`,
    { path, found, expected },
  );
}
