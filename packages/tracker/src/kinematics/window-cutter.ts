import type { Dims, LinkedBlock } from '../core/columns.js';
import { rowCount } from '../core/columns.js';
import type { CoreRange } from './fit-window.js';

/** A window and the frames of it whose samples are wanted. */
export interface FitTask {
  readonly window: LinkedBlock;
  readonly core: CoreRange;
}

/** A core of this many times the least rows is long enough with one lag of frames. */
const MANY_CORES = 8;

/**
 * Cuts a stream of linked blocks into windows: a core of at least `coreRows` rows and one to two `lag`s of
 * frames, with `lag` frames of overlap on both sides. Cuts depend on the rows of the frames alone, not on how the stream was cut
 * into blocks. Holds at most the blocks of one window and one block more. Brightness and given pathline numbers are
 * left behind: fits do not look at them.
 */
export async function* cutWindows(
  blocks: AsyncIterable<LinkedBlock>,
  lag: number,
  coreRows: number,
): AsyncGenerator<FitTask> {
  const held = new HeldFrames();
  /** Frames of the held ones that lie before the core. */
  let before = 0;
  for await (const block of blocks) {
    if (block.number.length === 0) continue;
    held.add(block);
    for (;;) {
      const end = coreEnd(held, before, lag, coreRows);
      if (end < 0 || end + lag > held.frames) break;
      yield { window: held.copy(0, end + lag), core: { from: before, to: end } };
      const drop = Math.max(0, end - lag);
      held.drop(drop);
      before = end - drop;
    }
  }
  while (held.frames > before) {
    const end = coreEnd(held, before, lag, coreRows);
    const to = end < 0 ? held.frames : end;
    yield { window: held.copy(0, Math.min(held.frames, to + lag)), core: { from: before, to } };
    const drop = Math.max(0, to - lag);
    held.drop(drop);
    before = to - drop;
  }
}

/** One past the last frame of a core that starts at frame `from`, or -1 where there are not yet frames enough. */
function coreEnd(held: HeldFrames, from: number, lag: number, coreRows: number): number {
  let rows = 0;
  for (let k = from; k < held.frames; k++) {
    rows += held.rowsOf(k);
    const frames = k + 1 - from;
    // Long cores spend less on overlap, short ones less memory: two lags long where frames are small, else one.
    if (rows >= coreRows && frames >= Math.max(1, rows >= MANY_CORES * coreRows ? lag : 2 * lag)) return k + 1;
  }
  return -1;
}

/** Blocks in a row, looked at as one sequence of frames. */
class HeldFrames {
  frames = 0;
  private readonly blocks: LinkedBlock[] = [];
  /** Frames of the first block that were dropped. */
  private skipped = 0;
  private readonly counts: number[] = [];

  add(block: LinkedBlock): void {
    this.blocks.push(block);
    for (let k = 0; k < block.number.length; k++) this.counts.push(block.offsets[k + 1]! - block.offsets[k]!);
    this.frames += block.number.length;
  }

  rowsOf(k: number): number {
    return this.counts[k]!;
  }

  drop(frames: number): void {
    this.frames -= frames;
    this.counts.splice(0, frames);
    this.skipped += frames;
    while (this.blocks.length > 0 && this.skipped >= this.blocks[0]!.number.length) {
      this.skipped -= this.blocks.shift()!.number.length;
    }
  }

  /** Frames `from .. to - 1` as one new block. */
  copy(from: number, to: number): LinkedBlock {
    const pieces: { block: LinkedBlock; first: number; last: number }[] = [];
    let at = -this.skipped;
    for (const block of this.blocks) {
      const first = Math.max(0, from - at);
      const last = Math.min(block.number.length, to - at);
      if (first < last) pieces.push({ block, first, last });
      at += block.number.length;
    }
    return joinFrames(pieces);
  }
}

function joinFrames(pieces: readonly { block: LinkedBlock; first: number; last: number }[]): LinkedBlock {
  const dims: Dims = pieces[0]?.block.dims ?? 2;
  let frames = 0;
  let rows = 0;
  for (const { block, first, last } of pieces) {
    frames += last - first;
    rows += block.offsets[last]! - block.offsets[first]!;
  }
  const joined = {
    dims,
    number: new Int32Array(frames),
    time: new Float64Array(frames),
    segment: new Int32Array(frames),
    offsets: new Uint32Array(frames + 1),
    x: new Float64Array(rows),
    y: new Float64Array(rows),
    z: new Float64Array(dims === 3 ? rows : 0),
    brightness: new Float32Array(0),
    row: new Float64Array(rows),
    given: new Int32Array(0),
    pathline: new Int32Array(rows),
    linkRisk: new Float32Array(rows),
  };
  let frame = 0;
  let row = 0;
  for (const { block, first, last } of pieces) {
    const start = block.offsets[first]!;
    const end = block.offsets[last]!;
    joined.number.set(block.number.subarray(first, last), frame);
    joined.time.set(block.time.subarray(first, last), frame);
    joined.segment.set(block.segment.subarray(first, last), frame);
    for (let k = first; k < last; k++) joined.offsets[frame + k - first + 1] = row + block.offsets[k + 1]! - start;
    joined.x.set(block.x.subarray(start, end), row);
    joined.y.set(block.y.subarray(start, end), row);
    if (dims === 3) joined.z.set(block.z.subarray(start, end), row);
    joined.row.set(block.row.subarray(start, end), row);
    joined.pathline.set(block.pathline.subarray(start, end), row);
    joined.linkRisk.set(block.linkRisk.subarray(start, end), row);
    frame += last - first;
    row += end - start;
  }
  return joined;
}

/** Blocks as one: for kernels that look at a few blocks at once. New arrays. */
export function joinBlocks(blocks: readonly LinkedBlock[]): LinkedBlock {
  return joinFrames(
    blocks.filter((block) => block.number.length > 0).map((block) => ({ block, first: 0, last: block.number.length })),
  );
}

/** Bytes that a window takes while it is fitted, about: its own columns, sorted rows and velocities, half as many samples. */
export function windowBytes(window: LinkedBlock): number {
  return rowCount(window) * (window.dims === 3 ? 150 : 120);
}
