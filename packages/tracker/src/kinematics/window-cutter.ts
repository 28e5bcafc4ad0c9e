import type { LinkedBlock } from '../core/columns.js';
import { rowCount } from '../core/columns.js';
import type { CoreRange } from './fit-window.js';
import { RollingFrames } from './rolling-frames.js';

/** A window and the frames of it whose samples are wanted. */
export interface FitTask {
  /** Borrowed until the next one is asked for. */
  readonly window: LinkedBlock;
  readonly core: CoreRange;
}

/** A core of this many times the least rows is long enough with one lag of frames. */
const MANY_CORES = 4;

/**
 * Cuts a stream of linked blocks into windows: a core of at least `coreRows` rows and one to two `lag`s of
 * frames, with `lag` frames of overlap on both sides. Cuts depend on the rows of the frames alone, not on how the
 * stream was cut into blocks. Holds the frames of one window and of one block more; windows are views of them.
 */
export async function* cutWindows(
  blocks: AsyncIterable<LinkedBlock>,
  lag: number,
  coreRows: number,
): AsyncGenerator<FitTask> {
  const held = new RollingFrames();
  /** Frames of the held ones that lie before the core. */
  let before = 0;
  for await (const block of blocks) {
    if (block.number.length === 0) continue;
    held.append(block);
    for (;;) {
      const end = coreEnd(held, before, lag, coreRows);
      if (end < 0 || end + lag > held.frames) break;
      yield { window: held.view(end + lag), core: { from: before, to: end } };
      const drop = Math.max(0, end - lag);
      held.drop(drop);
      before = end - drop;
    }
  }
  while (held.frames > before) {
    const end = coreEnd(held, before, lag, coreRows);
    const to = end < 0 ? held.frames : end;
    yield { window: held.view(Math.min(held.frames, to + lag)), core: { from: before, to } };
    const drop = Math.max(0, to - lag);
    held.drop(drop);
    before = to - drop;
  }
}

/** One past the last frame of a core that starts at frame `from`, or -1 where there are not yet frames enough. */
function coreEnd(held: RollingFrames, from: number, lag: number, coreRows: number): number {
  let rows = 0;
  for (let k = from; k < held.frames; k++) {
    rows += held.rowsOf(k);
    const frames = k + 1 - from;
    // Long cores spend less on overlap, short ones less memory: two lags long where frames are small, else one.
    if (rows >= coreRows && frames >= Math.max(1, rows >= MANY_CORES * coreRows ? lag : 2 * lag)) return k + 1;
  }
  return -1;
}

/** Bytes that a window takes while it is fitted, about: its own columns, sorted rows and velocities, half as many samples. */
export function windowBytes(window: LinkedBlock): number {
  return rowCount(window) * (window.dims === 3 ? 150 : 120);
}
