import { WakeloomError } from '../core/errors.js';
import type { DumpPass } from './dump-pass.js';
import { readBatches } from './read-batches.js';
import { ROLE } from './row-batch.js';

/** Bytes that one distinct time takes while they are gathered: an entry of a set of numbers, and the sorted copy. */
const BYTES_A_TIME = 48;

/**
 * Reads a dump without a frame column once for the distinct times of its rows, ascending: their places are the frame
 * numbers. Null as soon as it shows that the dump has a frame column after all.
 *
 * Throws `dump/order-needs-ram` when there are more times than the limit holds: a time a row is no time of a frame.
 */
export async function distinctTimes(pass: DumpPass): Promise<Float64Array | null> {
  const seen = new Set<number>();
  const most = Math.floor(pass.tools.ramLimit / BYTES_A_TIME);
  const time = pass.batch.columns[ROLE.time];
  for await (const _ of readBatches(pass)) {
    if (!pass.framesFromTimes) return null;
    let last = Number.NaN;
    for (let i = 0; i < pass.batch.rows; i++) {
      if (time[i] === last) continue;
      last = time[i];
      seen.add(last);
    }
    if (seen.size > most) {
      throw new WakeloomError(
        'dump/order-needs-ram',
        `frames from times: got more than ${most} distinct times, expected one time a frame and fewer; name a frame column or raise --ram-limit (${pass.files[0].name})`,
        { most },
      );
    }
  }
  return pass.framesFromTimes ? Float64Array.from(seen).sort() : null;
}
