import type { DetectionBlock } from '../core/columns.js';
import { createContext, type RunContext } from '../core/context.js';
import { WakeloomError } from '../core/errors.js';
import { type CalibrationTally, calibrate, newTally } from '../detections/calibrate.js';
import {
  dropFarAway,
  type FarAwayTally,
  type FieldLimits,
  fieldLimits,
  newFarAwayTally,
} from '../detections/far-away.js';
import { openDump } from '../detections/open-dump.js';
import { timeColumnWords } from '../detections/time-column.js';
import type { Board, Stage } from './board.js';
import { FIRST_LOOK, firstLook } from './first-look.js';
import { countInSteps, frameStep } from './frame-step.js';

/** Rows a block holds: small enough to live in the cache's neighbourhood, large enough to cost nothing. */
const BLOCK_ROWS = 40_000;

/** Reads the whole dump once: columns, frames, rows set aside, hash. */
export const scanStage: Stage = {
  name: 'scan',
  needs: [],
  gives: ['dump', 'scan'],
  async run(board) {
    const { request, tools, context } = board;
    const { settings } = request.resolved;
    board.dump = openDump(tools.sources, settings.dump, {
      hasher: tools.hasher,
      hdf5: tools.hdf5,
      ramLimit: Math.trunc(settings.results.ramLimit / 2),
    });
    board.scan = await board.dump.scan(context);
    for (const remark of board.scan.remarks) {
      context.event({ code: 'dump/remark', level: 'note', message: remark, details: {} });
    }
    const { note, warning } = timeColumnWords(board.scan, settings.clock, frameStep(board.scan.frameNumbers, settings.clock));
    if (note !== null) context.event({ code: 'dump/time-column', level: 'note', message: note, details: {} });
    if (warning !== null) context.event({ code: 'dump/rate-differs', level: 'warning', message: warning, details: {} });
    if (settings.dump.given !== 'ignore' && !board.scan.has.pathline) {
      throw new WakeloomError(
        'dump/no-pathline-column',
        `dump: got no column of pathline numbers, expected one because they are to be used ("${settings.dump.given}"); name it (run sheet: dump.columns.pathline) or link anew`,
      );
    }
    if (board.scan.rowsRead === 0) {
      throw new WakeloomError(
        'dump/no-detections',
        `dump: got no usable row of ${board.scan.rowsPresent}, expected detections (${tools.sources[0]?.name ?? 'no file'})`,
      );
    }
  },
};

/** Links the first frames on trial: flow, reach, noise, span. */
export const lookStage: Stage = {
  name: 'look',
  needs: ['dump', 'scan'],
  gives: ['look', 'limits'],
  async run(board) {
    const { request, context } = board;
    const first: DetectionBlock[] = [];
    let rows = 0;
    let frames = 0;
    // Its own tally and silent events: the same frames are read again by the run proper.
    const quiet = createContext({ signal: context.signal, bytes: context.budget.bytes });
    for await (const block of calibrated(board, quiet, newTally())) {
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
  run(board) {
    board.calibration = newTally();
    board.farAway = newFarAwayTally();
    const blocks = calibrated(board, board.context, board.calibration);
    board.detections = withinField(blocks, board.limits!, board.farAway, board.context);
  },
};

async function* calibrated(
  board: Board,
  context: Board['context'],
  tally: CalibrationTally,
): AsyncGenerator<DetectionBlock> {
  const { settings } = board.request.resolved;
  const scan = board.scan!;
  const step = frameStep(scan.frameNumbers, settings.clock);
  for await (const block of calibrate({ settings, scan, context, tally }, board.dump!.blocks(context, BLOCK_ROWS))) {
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
