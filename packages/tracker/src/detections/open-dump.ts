import type { ByteSource } from '../core/bytes.js';
import type { DetectionBlock } from '../core/columns.js';
import type { RunContext } from '../core/context.js';
import { WakeloomError } from '../core/errors.js';
import type { DumpSettings } from '../run/settings.js';
import type { Dump, DumpScan } from './dump.js';
import { DumpPass } from './dump-pass.js';
import type { DumpTools } from './dump-tools.js';
import { frameFromName, naturalOrder } from './file-order.js';
import { FrameFinisher } from './frame-finisher.js';
import { FrameGatherer, type OutOfOrder } from './frame-gatherer.js';
import { FrameNotes } from './frame-notes.js';
import { FrameTable } from './frame-table.js';
import { distinctTimes } from './frames-from-times.js';
import { changed, OrderedRows, refuseOverLimit } from './ordered-rows.js';
import { readBatches } from './read-batches.js';
import { ROLE, type RowBatch } from './row-batch.js';
import { place } from './row-ledger.js';
import { type RowShape, shapeOf } from './row-store.js';
import { refuseBadRows, refuseEmpty, refuseTimes, scanRemarks } from './scan-outcome.js';
import { timeStep } from './time-column.js';

export type { DumpTools } from './dump-tools.js';

/** Rows of a block where the caller does not say: about 3 MB, so that a slab holds many blocks. */
const BLOCK_ROWS = 65_536;

/** Rows gathered before the scan lets go of them. */
const SCAN_ROWS = 16_384;

/**
 * Opens the dump of one run. The sources (borrowed; the caller closes them) are read in the order given; where their
 * names hold the frame numbers, in that of those. Rows are counted over all of them. Nothing is read before `scan`.
 *
 * `scan` reads the dump once: rows present, read and set aside, frames, bounds, SHA-256 of each file as on disk; it
 * tells each reason for setting rows aside and each remark as an event too. `blocks` reads it again by the same way.
 * Rows out of frame order are put in order by a third reading within `scan`, kept in memory for `blocks`.
 *
 * Memory: a buffer of 1 MiB, the frames of one block, one entry a frame; for rows out of order 28 to 52 bytes a row.
 *
 * Errors: `dump/no-files`, `dump/empty`, `dump/header-only`, `dump/no-such-column`, `dump/columns-unclear`,
 * `dump/no-separator`, `dump/decimal-is-separator`, `dump/not-text`, `dump/utf-16`, `dump/old-line-ends`,
 * `dump/line-too-long`, `dump/files-differ`, `dump/too-many-bad-rows`, `dump/times-differ`, `dump/order-needs-ram`,
 * `dump/changed`, `dump/read-failed`, `dump/no-frame-in-name`, those of decompression (byte-stream.ts) and of the
 * binary formats (read-npy.ts, read-hdf5.ts, read-parquet.ts), `run/aborted`; `usage/scan-first`.
 */
export function openDump(sources: readonly ByteSource[], settings: DumpSettings, tools: DumpTools): Dump {
  if (sources.length === 0) {
    throw new WakeloomError(
      'dump/no-files',
      `no dump: got no file for ${settings.files.join(', ') || 'the dump'}, expected at least one`,
      { files: settings.files },
    );
  }
  return new OpenDump(sources, settings, tools);
}

class OpenDump implements Dump {
  readonly #files: readonly ByteSource[];
  readonly #settings: DumpSettings;
  readonly #tools: DumpTools;
  #scan: DumpScan | null = null;
  #shape: RowShape | null = null;
  #ordered: OrderedRows | null = null;
  /** Distinct times that frames are numbered by, where there is no frame column. */
  #times: Float64Array | null = null;

  constructor(sources: readonly ByteSource[], settings: DumpSettings, tools: DumpTools) {
    this.#files = settings.layout === 'frame-from-name' ? byFrame(sources) : [...sources];
    this.#settings = settings;
    this.#tools = tools;
  }

  #pass(context: RunContext, hashing: boolean): DumpPass {
    const times = this.#times;
    return new DumpPass({ files: this.#files, settings: this.#settings, tools: this.#tools, context, hashing, times });
  }

  async scan(context: RunContext): Promise<DumpScan> {
    if (this.#settings.timesAreClock === true) this.#times = await distinctTimes(this.#pass(context, false));
    const pass = this.#pass(context, true);
    const table = new FrameTable();
    let notes = new FrameNotes();
    let finisher = new FrameFinisher(pass.ledger, pass.fileOf);
    let gatherer: FrameGatherer | null = null;
    let outOfOrder: OutOfOrder | null = null;
    for await (const _ of readBatches(pass)) {
      gatherer ??= new FrameGatherer(shapeOf(pass.batch.used), SCAN_ROWS, finisher, notes.seen);
      countFrames(pass.batch, table);
      for (let i = 0; i < pass.batch.rows && outOfOrder === null; ) {
        i = gatherer.feed(pass.batch, i);
        outOfOrder = gatherer.outOfOrder;
        if (gatherer.due) gatherer.drop();
      }
    }
    refuseEmpty(pass);
    let shape = shapeOf(pass.batch.used);
    this.#ordered = null;
    if (outOfOrder === null) gatherer?.endFrame();
    else {
      // What was found at one place so far was found in pieces of frames.
      pass.ledger.forget('same-place');
      refuseBadRows(pass);
      notes = new FrameNotes();
      finisher = new FrameFinisher(pass.ledger, pass.fileOf);
      const { numbers, values } = table.sorted();
      const rows = pass.ledger.rowsPresent - pass.ledger.count();
      refuseOverLimit(rows, numbers.length, shape, this.#tools.ramLimit, this.#files[0].name);
      const again = this.#pass(context, true);
      this.#ordered = await OrderedRows.collect(again, numbers, values, shape, finisher, notes.seen);
      if (!sameBytes(again, pass.hashes)) throw changed(again);
    }
    refuseBadRows(pass);
    refuseTimes(pass, finisher);
    const remarks = [
      ...this.#repeatedNames(),
      ...this.#unusualOrder(),
      ...scanRemarks(pass, notes, finisher, outOfOrder),
    ];
    const plane = notes.max[2];
    if (shape.z && notes.min[2] === plane) {
      // Nothing can be measured along an axis that no detection moves on, its noise least of all.
      shape = { ...shape, z: false };
      this.#ordered?.flatten();
      notes.min[2] = notes.max[2] = Number.NaN;
      remarks.push(`z is ${plane} in every row: taken as a light sheet, in the plane`);
    }
    this.#shape = shape;
    this.#scan = {
      files: this.#files.map((file, i) => ({
        name: file.name,
        bytes: file.size,
        modified: file.modified,
        sha256: pass.hashes[i],
      })),
      format: pass.format ?? 'text',
      dims: shape.z ? 3 : 2,
      has: { brightness: shape.brightness, pathline: shape.pathline, time: shape.time },
      columns: { ...this.#frameColumn(), ...pass.columns },
      rowsPresent: pass.ledger.rowsPresent,
      rowsRead: notes.rows,
      setAside: pass.ledger.list(),
      frameNumbers: notes.numbers,
      frameCounts: notes.counts,
      timeStep: timeStep(notes.numbers, notes.times),
      ordered: outOfOrder === null,
      bounds: { min: notes.min, max: notes.max },
      remarks,
    };
    tell(context, this.#scan);
    return this.#scan;
  }

  async *blocks(context: RunContext, rows: number = BLOCK_ROWS): AsyncGenerator<DetectionBlock> {
    const scan = this.#scan;
    const shape = this.#shape;
    if (scan === null || shape === null) {
      throw new WakeloomError(
        'usage/scan-first',
        'dump not scanned: got a call of blocks, expected scan to settle first',
      );
    }
    if (this.#ordered !== null) {
      for (let first = 0; first < scan.frameNumbers.length; ) {
        await context.breathe();
        const block = this.#ordered.block(first, rows);
        first += block.number.length;
        yield block;
      }
      return;
    }
    const pass = this.#pass(context, true);
    const gatherer = new FrameGatherer(shape, rows, new FrameFinisher(pass.ledger, pass.fileOf));
    for await (const _ of readBatches(pass)) {
      for (let i = 0; i < pass.batch.rows; ) {
        i = gatherer.feed(pass.batch, i);
        if (gatherer.outOfOrder !== null) throw changed(pass);
        const block = gatherer.due ? gatherer.take() : null;
        if (block !== null) yield block;
      }
    }
    gatherer.endFrame();
    const { rowsPresent } = pass.ledger;
    if (rowsPresent !== scan.rowsPresent || rowsPresent - pass.ledger.count() !== scan.rowsRead) throw changed(pass);
    // What run.json says the run was made from must be what it was made from: rows alone may keep their number.
    const noted = scan.files.map((file) => file.sha256);
    if (!sameBytes(pass, noted)) throw changed(pass);
    const block = gatherer.take();
    if (block !== null) yield block;
  }

  #frameColumn(): Record<string, string> {
    if (this.#settings.layout === 'frame-from-name') return { frame: 'last number in the file name' };
    return this.#settings.layout === 'frame-from-order' ? { frame: 'order of the files, from 0' } : {};
  }

  /** Shells sort f10 before f2: whoever gave a list in such an order should know what it did to the frames. */
  #unusualOrder(): string[] {
    if (this.#settings.layout !== 'frame-from-order') return [];
    const names = this.#files.map(({ name }) => name);
    const at = names.findIndex((name, i) => i > 0 && naturalOrder(names[i - 1], name) > 0);
    if (at < 0) return [];
    return [
      `files are taken in the order given, which is not that of the numbers in their names (${names[at - 1]} before ${names[at]}); give a quoted pattern with * to have them sorted`,
    ];
  }

  #repeatedNames(): string[] {
    if (this.#settings.layout !== 'frame-from-name') return [];
    const seen = new Map<number, string>();
    const repeated = this.#files.filter(({ name }) => {
      const frame = frameFromName(name);
      if (seen.has(frame)) return true;
      seen.set(frame, name);
      return false;
    });
    if (repeated.length === 0) return [];
    const { name } = repeated[0];
    const frame = frameFromName(name);
    return [
      `${repeated.length} files repeat a frame number, first ${name} and ${seen.get(frame)} (frame ${frame}): taken as one frame`,
    ];
  }
}

/** In ascending order of the frame numbers in the names; files of one number keep their order. */
function byFrame(sources: readonly ByteSource[]): ByteSource[] {
  const numbered = sources.map((source) => ({ source, frame: frameFromName(source.name) }));
  return numbered.sort((a, b) => a.frame - b.frame).map(({ source }) => source);
}

function sameBytes(pass: DumpPass, hashes: readonly string[]): boolean {
  return pass.hashes.every((hash, i) => hash === hashes[i]);
}

function countFrames(batch: RowBatch, table: FrameTable): void {
  const frame = batch.columns[ROLE.frame];
  for (let i = 0; i < batch.rows; ) {
    let end = i + 1;
    while (end < batch.rows && frame[end] === frame[i]) end++;
    table.add(frame[i], end - i);
    i = end;
  }
}

function tell(context: RunContext, scan: DumpScan): void {
  for (const { reason, count, examples } of scan.setAside) {
    const named = examples.map(({ file, line, found }) => `${place(file, line)}: ${found}`);
    context.event({
      code: 'dump/row-set-aside',
      level: 'warning',
      message: `${count} of ${scan.rowsPresent} rows set aside: ${reason} (${named.join('; ')})`,
      details: { reason, count, rowsPresent: scan.rowsPresent, examples },
    });
  }
  for (const message of scan.remarks) context.event({ code: 'dump/remark', level: 'note', message, details: {} });
}
