import { WakeloomError } from '../core/errors.js';

/**
 * Natural order of names: runs of digits compare as numbers, the rest by code unit, so that frame_2 stands before
 * frame_10 everywhere, whatever the language of the machine. Equal names keep their order.
 */
export function naturalOrder(a: string, b: string): number {
  const partsA = a.match(/\d+|\D+/g) ?? [];
  const partsB = b.match(/\d+|\D+/g) ?? [];
  for (let i = 0; i < Math.min(partsA.length, partsB.length); i++) {
    const [p, q] = [partsA[i], partsB[i]];
    const digits = /^\d/.test(p) && /^\d/.test(q);
    // Without leading zeros a longer run of digits is the larger number, however many there are.
    const [m, n] = digits ? [p.replace(/^0+/, ''), q.replace(/^0+/, '')] : [p, q];
    if (digits && m.length !== n.length) return m.length - n.length;
    if (m !== n) return m < n ? -1 : 1;
  }
  return partsA.length - partsB.length || (a < b ? -1 : a > b ? 1 : 0);
}

/**
 * Frame number from the last number in a file's name: `run2/image_0042.csv.gz` is frame 42. Folders and endings
 * (which may hold digits, as `.h5` does) do not count; a minus sign is read as a hyphen.
 * Throws `dump/no-frame-in-name` when there is none or it is beyond 2^31 - 1.
 */
export function frameFromName(name: string): number {
  let stem = name.replace(/^.*[/\\]/, '');
  for (let before = ''; before !== stem; ) {
    before = stem;
    stem = stem.replace(/\.[A-Za-z][A-Za-z0-9]*$/, '');
  }
  const last = stem.match(/\d+/g)?.at(-1);
  const frame = last === undefined ? Number.NaN : Number(last);
  if (frame <= 0x7fffffff) return frame;
  throw new WakeloomError(
    'dump/no-frame-in-name',
    `no frame number in a file name: got "${stem}", expected a number from 0 to 2147483647 in it, or layout: frame-from-order (${name})`,
    { file: name },
  );
}
