import { WakeloomError } from '../core/errors.js';
import type { ByteStream } from './byte-stream.js';
import { planColumns } from './column-plan.js';
import type { DumpPass } from './dump-pass.js';
import { BATCH_ROWS } from './row-batch.js';
import { sniffText } from './text-layout.js';
import { TextParser } from './text-parser.js';

/** Size of the one buffer that text is read into; also the longest line taken. */
export const TEXT_BUFFER = 1 << 20;

const MARK = [0xef, 0xbb, 0xbf];

/**
 * Reads a text file from `stream`, of which `filled` bytes stand in `buffer` already (TEXT_BUFFER + 1 long). Yields
 * whenever `pass.batch` holds rows; the caller empties it. Memory: the buffer.
 *
 * Throws `dump/line-too-long` and what sniffing, planning and the stream throw.
 */
export async function* readText(
  stream: ByteStream,
  file: string,
  buffer: Uint8Array,
  filled: number,
  pass: DumpPass,
): AsyncGenerator<void> {
  const { batch, ledger, settings } = pass;
  const rowsBefore = ledger.rowsPresent;
  let have = filled;
  let start = 0;
  if (MARK.every((byte, i) => i < have && buffer[i] === byte)) {
    start = 3;
    pass.remarks.add(`byte-order mark skipped in ${pass.files.length > 1 ? 'one file or more' : file}`);
  }
  let parser: TextParser | null = null;
  let lines = 0;
  for (let ended = false; !ended; ) {
    const free = TEXT_BUFFER - have;
    const got = await stream.read(buffer.subarray(have, TEXT_BUFFER));
    ended = got < free;
    have += got;
    // The inner loop runs to line feeds only: the last line gets one, the piece of a line behind the last one waits.
    if (ended && have > start && buffer[have - 1] !== 10) buffer[have++] = 10;
    const end = have === 0 ? start : Math.max(start, buffer.lastIndexOf(10, have - 1) + 1);
    if (end === start && !ended) {
      throw new WakeloomError(
        'dump/line-too-long',
        `line too long: got no line end within ${TEXT_BUFFER} bytes, expected rows of numbers (${file} line ${(parser?.line ?? lines) + 1})`,
        { file, line: (parser?.line ?? lines) + 1 },
      );
    }
    if (parser === null && end > start) {
      const layout = sniffText(buffer, start, end, settings, file, pass.layout);
      if (layout === null) lines += countLines(buffer, start, end);
      else {
        pass.layout ??= layout;
        for (const remark of layout.remarks) pass.remarks.add(remark);
        const plan = planColumns(
          {
            file,
            names: layout.names,
            count: layout.fields,
            firstIsWhole: layout.firstIsWhole,
            needsFrame: settings.layout === 'one-file-a-run',
            timesAreClock: settings.timesAreClock,
          },
          settings.columns,
        );
        pass.agreeColumns(file, plan);
        parser = new TextParser(layout, plan.index, file, ledger);
        parser.line = lines;
        parser.position = start;
        if (layout.headerIsLine) parser.skipHeader(buffer, end);
        start = parser.position;
      }
    }
    if (parser !== null) {
      parser.position = start;
      while (parser.position < end) {
        parser.parse(buffer, end, batch);
        if (batch.rows === BATCH_ROWS) yield;
        await pass.context.breathe();
      }
    }
    buffer.copyWithin(0, end, have);
    have -= end;
    start = 0;
  }
  if (batch.rows > 0) yield;
  if (parser === null) pass.emptyFiles.push(file);
  else if (ledger.rowsPresent === rowsBefore) pass.headerOnlyFiles.push(file);
}

function countLines(bytes: Uint8Array, start: number, end: number): number {
  let count = 0;
  for (let at = bytes.indexOf(10, start); at >= 0 && at < end; at = bytes.indexOf(10, at + 1)) count++;
  return count;
}
