import type { Dims, LinkedBlock } from '../core/columns.js';
import { rowCount } from '../core/columns.js';

type Column = Float64Array | Float32Array | Int32Array | Uint32Array;

const EMPTY = { brightness: new Float32Array(0), given: new Int32Array(0) } as const;

/**
 * Linked frames in a row, in one set of columns that grows at its end and is cut at its front. Brightness and given
 * pathline numbers are left behind: fits do not look at them. Memory: 32 bytes a row held (40 in a volume), at most
 * half as much again while it grows; nothing is allocated once it has its size.
 */
export class RollingFrames {
  frames = 0;
  private dims: Dims = 2;
  private rows = 0;
  private number = new Int32Array(64);
  private time = new Float64Array(64);
  private segment = new Int32Array(64);
  private offsets = new Uint32Array(65);
  private x = new Float64Array(0);
  private y = new Float64Array(0);
  private z = new Float64Array(0);
  private row = new Float64Array(0);
  private pathline = new Int32Array(0);
  private linkRisk = new Float32Array(0);

  /** Takes over the frames of a block; the block is borrowed. */
  append(block: LinkedBlock): void {
    const { frames, rows } = this;
    const moreFrames = block.number.length;
    const moreRows = rowCount(block);
    this.dims = block.dims;
    this.grow(frames + moreFrames, rows + moreRows);
    this.number.set(block.number, frames);
    this.time.set(block.time, frames);
    this.segment.set(block.segment, frames);
    for (let k = 0; k < moreFrames; k++) this.offsets[frames + k + 1] = rows + block.offsets[k + 1]!;
    this.x.set(block.x.subarray(0, moreRows), rows);
    this.y.set(block.y.subarray(0, moreRows), rows);
    if (block.dims === 3) this.z.set(block.z.subarray(0, moreRows), rows);
    this.row.set(block.row.subarray(0, moreRows), rows);
    this.pathline.set(block.pathline.subarray(0, moreRows), rows);
    this.linkRisk.set(block.linkRisk.subarray(0, moreRows), rows);
    this.frames += moreFrames;
    this.rows += moreRows;
  }

  rowsOf(k: number): number {
    return this.offsets[k + 1]! - this.offsets[k]!;
  }

  /** Cuts off the first frames. Views handed out before are void. */
  drop(frames: number): void {
    if (frames === 0) return;
    const from = this.offsets[frames]!;
    for (const column of [this.x, this.y, this.row, this.pathline, this.linkRisk]) {
      column.copyWithin(0, from, this.rows);
    }
    if (this.dims === 3) this.z.copyWithin(0, from, this.rows);
    for (const column of [this.number, this.time, this.segment]) column.copyWithin(0, frames, this.frames);
    for (let k = frames; k <= this.frames; k++) this.offsets[k - frames] = this.offsets[k]! - from;
    this.frames -= frames;
    this.rows -= from;
  }

  /** The first `frames` frames as views: borrowed until the next `append` or `drop`. */
  view(frames: number): LinkedBlock {
    const rows = this.offsets[frames]!;
    return {
      dims: this.dims,
      number: this.number.subarray(0, frames),
      time: this.time.subarray(0, frames),
      segment: this.segment.subarray(0, frames),
      offsets: this.offsets.subarray(0, frames + 1),
      x: this.x.subarray(0, rows),
      y: this.y.subarray(0, rows),
      z: this.z.subarray(0, this.dims === 3 ? rows : 0),
      row: this.row.subarray(0, rows),
      pathline: this.pathline.subarray(0, rows),
      linkRisk: this.linkRisk.subarray(0, rows),
      ...EMPTY,
    };
  }

  private grow(frames: number, rows: number): void {
    if (frames > this.number.length) {
      const size = 2 * frames;
      this.number = wider(this.number, new Int32Array(size));
      this.time = wider(this.time, new Float64Array(size));
      this.segment = wider(this.segment, new Int32Array(size));
      this.offsets = wider(this.offsets, new Uint32Array(size + 1));
    }
    const deep = this.dims === 3;
    if (rows > this.x.length || (deep && rows > this.z.length)) {
      const size = Math.ceil(1.25 * rows);
      this.x = wider(this.x, new Float64Array(size));
      this.y = wider(this.y, new Float64Array(size));
      if (deep) this.z = wider(this.z, new Float64Array(size));
      this.row = wider(this.row, new Float64Array(size));
      this.pathline = wider(this.pathline, new Int32Array(size));
      this.linkRisk = wider(this.linkRisk, new Float32Array(size));
    }
  }
}

function wider<C extends Column>(old: C, empty: C): C {
  empty.set(old);
  return empty;
}

/** Blocks as one, for kernels that look at a few blocks at once. New arrays. */
export function joinBlocks(blocks: readonly LinkedBlock[]): LinkedBlock {
  const joined = new RollingFrames();
  for (const block of blocks) if (block.number.length > 0) joined.append(block);
  return joined.view(joined.frames);
}
