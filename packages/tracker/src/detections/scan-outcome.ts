import { WakeloomError } from '../core/errors.js';
import type { DumpPass } from './dump-pass.js';
import type { FrameFinisher } from './frame-finisher.js';
import type { OutOfOrder } from './frame-gatherer.js';
import type { FrameNotes } from './frame-notes.js';
import { place } from './row-ledger.js';

/** Throws `dump/empty` or `dump/header-only` when a pass met no row at all. */
export function refuseEmpty(pass: DumpPass): void {
  if (pass.ledger.rowsPresent > 0) return;
  const file = pass.headerOnlyFiles[0] ?? pass.files[0].name;
  const more = pass.files.length > 1 ? ` and ${pass.files.length - 1} more` : '';
  if (pass.headerOnlyFiles.length > 0) {
    throw new WakeloomError(
      'dump/header-only',
      `no rows: got a header and nothing below it, expected at least one detection (${file}${more})`,
      { file },
    );
  }
  throw new WakeloomError(
    'dump/empty',
    `empty dump: got no line that holds anything, expected at least one detection (${file}${more})`,
    { file },
  );
}

/** Throws `dump/too-many-bad-rows` when the share of rows set aside is above the limit, or no row is left. */
export function refuseBadRows(pass: DumpPass): void {
  const present = pass.ledger.rowsPresent;
  const bad = pass.ledger.count();
  const limit = pass.settings.badRowsLimit;
  if (bad < present && bad <= limit * present) return;
  const list = pass.ledger.list();
  const reasons = list.map(({ reason, count, examples: [first] }) => {
    return `${reason} ${count}, first at ${place(first.file, first.line)}: ${first.found}`;
  });
  const details: Record<string, string | number> = { rowsPresent: present, setAside: bad, limit };
  for (const { reason, count } of list) details[reason] = count;
  const examples = list.flatMap(({ reason, examples }) =>
    examples.map(({ file, line, found }) => `${reason} at ${place(file, line)}: ${found}`),
  );
  throw new WakeloomError(
    'dump/too-many-bad-rows',
    `too many bad rows: got ${bad} of ${present} set aside (${reasons.join('; ')}), expected at most a share of ${limit}; ${likelyCause(pass, bad)}`,
    { ...details, examples },
  );
}

/** What most rows set aside point to, and what to do about it. */
function likelyCause(pass: DumpPass, bad: number): string {
  const { ledger } = pass;
  const present = ledger.rowsPresent;
  const twice = ledger.count('same-place');
  if (twice > bad / 2) {
    // Each place that holds k rows sets k - 1 aside: half of all rows where each stands twice. A few odd ones may differ.
    const copies = Math.round(present / (present - twice));
    const whole = copies > 1 && Math.abs(present / (present - twice) / copies - 1) < 0.01;
    const times = copies === 2 ? 'twice' : `${copies} times`;
    const what = whole ? `every row stands ${times}` : 'rows stand more than once';
    const percent = Math.ceil((100 * bad) / present);
    return `${what}, as when a file is written or given ${whole ? times : 'twice'}: leave the copies out, or keep one row of each place with --bad-rows-limit ${percent}%`;
  }
  if (ledger.count('frame-not-whole') > bad / 2) {
    return 'if the frame column holds times, add --times yes; else check columns and decimal mark';
  }
  return 'check separator, decimal mark and columns';
}

/** Throws `dump/times-differ` when more rows than the bad-row limit allows contradict the time of their frame. */
export function refuseTimes(pass: DumpPass, finisher: FrameFinisher): void {
  const { count, frame, row, line } = finisher.offTime;
  if (count <= pass.settings.badRowsLimit * pass.ledger.rowsPresent) return;
  const where = place(pass.fileOf(row), line);
  throw new WakeloomError(
    'dump/times-differ',
    `times within a frame: got ${count} rows whose time differs from that of most rows of their frame, expected one time a frame; give columns: { time: null } if that column is no frame time (first in frame ${frame}, ${where})`,
    { count, frame, file: pass.fileOf(row), line },
  );
}

/** What the user should know about a dump that was read: plain sentences in a fixed order. */
export function scanRemarks(
  pass: DumpPass,
  notes: FrameNotes,
  finisher: FrameFinisher,
  outOfOrder: OutOfOrder | null,
): string[] {
  const remarks = [...pass.remarks];
  if (pass.framesFromTimes) {
    remarks.push(
      `no frame column: ${notes.numbers.length} frames are numbered from 0 by their distinct times; a frame without any detection does not count`,
    );
  }
  const at = (row: number, line: number) => place(pass.fileOf(row), line);
  if (outOfOrder !== null) {
    const { frame, after, row, line } = outOfOrder;
    remarks.push(
      `rows are not in frame order (first at ${at(row, line)}: frame ${frame} after frame ${after}): put in order in memory`,
    );
  }
  if (notes.firstJump !== null) {
    const { frame, after, row, line } = notes.firstJump;
    const times = notes.jumps === 1 ? 'once' : `${notes.jumps} times`;
    remarks.push(
      `frame number jumps by more than ten thousand ${times}, first from ${after} to ${frame} (${at(row, line)}): kept as it is`,
    );
  }
  if (notes.missing > 0) {
    remarks.push(
      `${notes.missing} frame numbers without any detection between frames that have some, first ${notes.firstMissing}`,
    );
  }
  if (finisher.offTime.count > 0) {
    const { count, frame, row, line } = finisher.offTime;
    remarks.push(
      `${count} rows with another time than most rows of their frame, first in frame ${frame} (${at(row, line)}): the time of most rows counts`,
    );
  }
  if (finisher.backwards.count > 0) {
    const { count, frame, row, line } = finisher.backwards;
    remarks.push(
      `${count} frames whose time is not later than that of the frame before, first frame ${frame} (${at(row, line)})`,
    );
  }
  if (pass.oddities.pathlineNumbers > 0) {
    remarks.push(
      `${pass.oddities.pathlineNumbers} pathline numbers that are not whole or beyond 2147483647: taken as not linked`,
    );
  }
  for (const [files, what] of [
    [pass.emptyFiles, 'empty files'],
    [pass.headerOnlyFiles, 'files with a header and no row'],
  ] as const) {
    if (files.length > 0) remarks.push(`${files.length} ${what}, first ${files[0]}: taken as holding no detection`);
  }
  return remarks;
}
