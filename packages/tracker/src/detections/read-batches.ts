import type { ByteSource } from '../core/bytes.js';
import { openStream, readFrom, readHead } from './byte-stream.js';
import type { DumpPass } from './dump-pass.js';
import { FILE_MAGIC, fileFormat, HEAD_BYTES, hasMagic } from './file-kind.js';
import { frameFromName } from './file-order.js';
import { judgeRows } from './judge-rows.js';
import { numberFrames } from './number-frames.js';
import { readHdf5 } from './read-hdf5.js';
import { readNpy } from './read-npy.js';
import { readParquet } from './read-parquet.js';
import { readText, TEXT_BUFFER } from './read-text.js';
import { ROLE } from './row-batch.js';

/** Piece of a file hashed at a time where hashing is apart from reading. */
const HASH_CHUNK = 1 << 20;

/**
 * Reads the whole dump of a pass, file after file, and yields whenever `pass.batch` holds judged rows, in reading
 * order. The consumer takes the rows before it asks for more. This is the one way in which bytes become rows.
 */
export async function* readBatches(pass: DumpPass): AsyncGenerator<void> {
  const { batch, ledger, settings, context } = pass;
  const buffer = new Uint8Array(TEXT_BUFFER + 1);
  for (const [at, file] of pass.files.entries()) {
    await context.breathe();
    pass.beginFile();
    let frame: number | null = null;
    if (settings.layout === 'frame-from-name') frame = frameFromName(file.name);
    else if (settings.layout === 'frame-from-order') frame = at;
    for await (const _ of readFile(file, buffer, pass)) {
      if (frame !== null) batch.columns[ROLE.frame].fill(frame, 0, batch.rows);
      else if (pass.framesFromTimes) {
        if (pass.times === null) batch.columns[ROLE.frame].fill(0, 0, batch.rows);
        else numberFrames(batch, pass.times);
      }
      judgeRows(batch, file.name, ledger, pass.oddities);
      if (batch.rows > 0) yield;
      batch.rows = 0;
    }
  }
}

async function* readFile(file: ByteSource, buffer: Uint8Array, pass: DumpPass): AsyncGenerator<void> {
  const head = await readHead(file, HEAD_BYTES);
  const packed = hasMagic(head, FILE_MAGIC.gzip) || hasMagic(head, FILE_MAGIC.zstd);
  const format = packed ? 'text' : fileFormat(head, false, file.name, pass.settings.format);
  if (format === 'text' || head.length === 0) {
    const hasher = pass.startHash();
    const stream = await openStream(file, { hasher, advance: pass.advance });
    try {
      const filled = await stream.read(buffer.subarray(0, TEXT_BUFFER));
      if (packed) fileFormat(buffer.subarray(0, Math.min(filled, HEAD_BYTES)), true, file.name, pass.settings.format);
      if (filled > 0) pass.agreeFormat(file.name, 'text');
      yield* readText(stream, file.name, buffer, filled, pass);
    } finally {
      await stream.close();
    }
    pass.endHash(hasher);
    return;
  }
  pass.agreeFormat(file.name, format);
  const rowsBefore = pass.ledger.rowsPresent;
  if (format === 'npy') yield* readNpy(file, pass);
  else if (format === 'hdf5') yield* readHdf5(file, pass);
  else yield* readParquet(file, pass);
  if (pass.ledger.rowsPresent === rowsBefore) pass.headerOnlyFiles.push(file.name);
  // Last, so that whoever wants the first frames only does not wait for it.
  if (pass.hashing) await hashFile(file, buffer, pass);
}

async function hashFile(file: ByteSource, buffer: Uint8Array, pass: DumpPass): Promise<void> {
  pass.expect(file.size);
  const hasher = pass.startHash();
  for (let position = 0; ; ) {
    const piece = buffer.subarray(0, HASH_CHUNK);
    const got = await readFrom(file, position, piece);
    if (got === 0) break;
    hasher?.update(piece.subarray(0, got));
    position += got;
    pass.advance(got);
    await pass.context.breathe();
  }
  pass.endHash(hasher);
}
