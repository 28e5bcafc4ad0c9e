import type { DetectionBlock } from '../core/columns.js';
import { createContext, type RunContext } from '../core/context.js';
import { isWakeloomError, WakeloomError } from '../core/errors.js';
import { type CalibrationTally, calibrate, newTally } from '../detections/calibrate.js';
import type { DumpScan } from '../detections/dump.js';
import {
  dropFarAway,
  type FarAwayTally,
  type FieldLimits,
  fieldLimits,
  newFarAwayTally,
} from '../detections/far-away.js';
import { openDump } from '../detections/open-dump.js';
import { timeColumnWords } from '../detections/time-column.js';
import type { DumpSettings } from '../run/settings.js';
import type { Board, Stage } from './board.js';
import { FIRST_LOOK, firstLook } from './first-look.js';
import { countInSteps, frameStep } from './frame-step.js';

/** Rows a block holds: small enough to live in the cache's neighbourhood, large enough to cost nothing. */
const BLOCK_ROWS = 40_000;

/**
 * Frames a block of the first look holds at least, rows permitting: it pairs frames, measures noise and chooses the span
 * within blocks, and a block of one large frame would show it no pair at all.
 */
const LOOK_FRAMES = 12;

/** Reads the whole dump once: columns, frames, rows set aside, hash. */
export const scanStage: Stage = {
  name: 'scan',
  needs: [],
  gives: ['dump', 'scan'],
  timed: true,
  async run(board) {
    const { request, tools, context } = board;
    const { settings } = request.resolved;
    board.dump = openDump(tools.sources, settings.dump, {
      hasher: tools.hasher,
      hdf5: tools.hdf5,
      ramLimit: Math.trunc(settings.results.ramLimit / 2),
    });
    try {
      // It tells what it finds by itself.
      board.scan = await board.dump.scan(context);
    } catch (error) {
      throw tools.sources.length > 1 ? withLayoutHint(error, settings.dump.layout, tools.sources.length) : error;
    }
    const { scan } = board;
    if (settings.dump.given !== 'ignore' && !scan.has.pathline) {
      throw new WakeloomError(
        'dump/no-pathline-column',
        `dump: got no column of pathline numbers, expected one because they are to be used ("${settings.dump.given}"); name it (run sheet: dump.columns.pathline) or link anew`,
      );
    }
    if (scan.rowsRead === 0) {
      throw new WakeloomError(
        'dump/no-detections',
        `dump: got no usable row of ${scan.rowsPresent}, expected detections (${tools.sources[0]?.name ?? 'no file'})`,
      );
    }
    if (scan.frameNumbers.length === 1) {
      throw new WakeloomError(
        'dump/one-frame',
        `dump: got one frame only (number ${scan.frameNumbers[0]}, ${scan.rowsRead} detections), expected at least two to link between; check the frame column, ${scan.columns['frame'] ?? 'unknown'} (${tools.sources[0].name})`,
        { frame: scan.frameNumbers[0], detections: scan.rowsRead },
      );
    }
    tellScan(scan, settings.dump.given, context);
    const { note, warning } = timeColumnWords(scan, settings.clock, frameStep(scan.frameNumbers, settings.clock));
    if (note !== null) context.event({ code: 'dump/time-column', level: 'note', message: note, details: {} });
    if (warning !== null) context.event({ code: 'dump/rate-differs', level: 'warning', message: warning, details: {} });
  },
};

/** Size and shape of what was read, and what is in it but left unused. */
function tellScan(scan: DumpScan, given: DumpSettings['given'], context: RunContext): void {
  const { files, rowsRead, rowsPresent, frameNumbers } = scan;
  const bytes = files.reduce((sum, file) => sum + file.bytes, 0);
  const more = files.length > 1 ? ` to ${files[files.length - 1].name}, ${files.length} files` : '';
  context.event({
    code: 'dump/inputs',
    level: 'info',
    message: `${files[0].name}${more}, ${bytes} bytes, ${scan.format}`,
    details: { files: files.length, bytes, first: files[0], last: files[files.length - 1], columns: scan.columns },
  });
  if (scan.has.pathline && given === 'ignore') {
    context.event({
      code: 'dump/pathline-numbers-ignored',
      level: 'note',
      message: `the dump carries pathline numbers (${scan.columns['pathline']}), which are ignored: links are made anew; keep or check them with --pathline-numbers`,
      details: {},
    });
  }
  context.event({
    code: 'run/scanned',
    level: 'info',
    message: `${rowsRead} of ${rowsPresent} rows read, ${frameNumbers.length} frames`,
    details: { rowsPresent, rowsRead, frames: frameNumbers.length },
  });
}

/** Several files without a frame column are mostly one file a frame: then the message says which setting makes them so. */
function withLayoutHint(error: unknown, layout: DumpSettings['layout'], files: number): unknown {
  if (!isWakeloomError(error) || layout !== 'one-file-a-run') return error;
  const frameless = error.code === 'dump/no-such-column' && error.details['role'] === 'frame';
  if (!frameless && error.code !== 'dump/columns-unclear') return error;
  const message = `${error.message}; for one file a frame (${files} files were given) add --layout frame-from-name or frame-from-order`;
  return new WakeloomError(error.code, message, error.details, error);
}

/** Links the first frames on trial: flow, reach, noise, span. */
export const lookStage: Stage = {
  name: 'look',
  needs: ['dump', 'scan'],
  gives: ['look', 'limits'],
  timed: true,
  async run(board) {
    const { request, context } = board;
    const first: DetectionBlock[] = [];
    let rows = 0;
    let frames = 0;
    // Its own tally and silent events: the same frames are read again by the run proper.
    const quiet = createContext({ signal: context.signal, bytes: context.budget.bytes });
    const { rowsRead, frameNumbers } = board.scan!;
    const several = Math.min(FIRST_LOOK.rows, Math.ceil((LOOK_FRAMES * rowsRead) / frameNumbers.length));
    for await (const block of calibrated(board, quiet, newTally(), Math.max(BLOCK_ROWS, several))) {
      first.push(block);
      rows += block.x.length;
      frames += block.number.length;
      if (frames >= FIRST_LOOK.frames || rows >= FIRST_LOOK.rows) break;
    }
    board.limits = fieldLimits(first);
    const tally = newFarAwayTally();
    for (const [k, block] of first.entries()) first[k] = dropFarAway(block, board.limits, tally);
    const { settings } = request.resolved;
    const step = frameStep(board.scan!.frameNumbers, settings.clock);
    if (step > 1) {
      context.event({
        code: 'dump/frame-step',
        level: 'note',
        message: `frame numbers go in steps of ${step}: the frames between are taken as not recorded, not as missing`,
        details: { step },
      });
    }
    board.look = await firstLook(first, settings, step, context);
  },
};

/** Opens the stream of calibrated detections. */
export const detectionsStage: Stage = {
  name: 'detections',
  needs: ['dump', 'scan', 'limits'],
  gives: ['detections', 'calibration', 'farAway'],
  timed: false,
  run(board) {
    board.calibration = newTally();
    board.farAway = newFarAwayTally();
    const blocks = calibrated(board, board.context, board.calibration, BLOCK_ROWS);
    board.detections = withinField(blocks, board.limits!, board.farAway, board.context);
  },
};

async function* calibrated(
  board: Board,
  context: Board['context'],
  tally: CalibrationTally,
  rows: number,
): AsyncGenerator<DetectionBlock> {
  const { settings } = board.request.resolved;
  const scan = board.scan!;
  const step = frameStep(scan.frameNumbers, settings.clock);
  for await (const block of calibrate({ settings, scan, context, tally }, board.dump!.blocks(context, rows))) {
    countInSteps(block, scan.frameNumbers[0], step);
    yield block;
  }
}

/** Leaves out what lies far from the field, and says so at the end. */
async function* withinField(
  blocks: AsyncIterable<DetectionBlock>,
  limits: FieldLimits,
  tally: FarAwayTally,
  context: RunContext,
): AsyncGenerator<DetectionBlock> {
  for await (const block of blocks) yield dropFarAway(block, limits, tally);
  if (tally.farAway === 0) return;
  const places = tally.examples.map(({ row, x, y }) => `row ${row} at ${x}, ${y}`).join('; ');
  context.event({
    code: 'dump/far-away',
    level: 'warning',
    message: `${tally.farAway} detections lie more than ten fields away and were left out (data ${places}${tally.farAway > tally.examples.length ? '; ...' : ''})`,
    details: { count: tally.farAway, examples: tally.examples },
  });
}
