import type { LinkedBlock } from '../core/columns.js';
import { rowCount } from '../core/columns.js';

/** Linked rows of a few blocks sorted by pathline and time. */
export interface SortedRows {
  /** First entry of each pathline. [pathlines + 1] */
  readonly start: Uint32Array;
  readonly frame: Int32Array;
  readonly time: Float64Array;
  readonly x: Float64Array;
  readonly y: Float64Array;
  readonly z: Float64Array;
}

/**
 * Copies the linked rows of a few blocks in pathline order, each pathline in frame order. For the bounded first look
 * at a run: memory and cost grow with the blocks given.
 */
export function sortByPathline(blocks: readonly LinkedBlock[]): SortedRows {
  const slots = new Map<number, number>();
  let linked = 0;
  const counts: number[] = [];
  for (const block of blocks) {
    const rows = rowCount(block);
    for (let r = 0; r < rows; r++) {
      const id = block.pathline[r]!;
      if (id < 0) continue;
      linked++;
      const slot = slots.get(id);
      if (slot !== undefined) {
        counts[slot] = counts[slot]! + 1;
        continue;
      }
      slots.set(id, counts.length);
      counts.push(1);
    }
  }
  const start = new Uint32Array(counts.length + 1);
  for (let p = 0; p < counts.length; p++) start[p + 1] = start[p]! + counts[p]!;
  const next = start.slice();
  const deep = blocks.some((block) => block.dims === 3);
  const sorted = {
    start,
    frame: new Int32Array(linked),
    time: new Float64Array(linked),
    x: new Float64Array(linked),
    y: new Float64Array(linked),
    z: new Float64Array(deep ? linked : 0),
  };
  for (const block of blocks) {
    for (let k = 0; k < block.number.length; k++) {
      for (let r = block.offsets[k]!; r < block.offsets[k + 1]!; r++) {
        const id = block.pathline[r]!;
        if (id < 0) continue;
        const slot = slots.get(id)!;
        const to = next[slot]!;
        next[slot] = to + 1;
        sorted.frame[to] = block.number[k]!;
        sorted.time[to] = block.time[k]!;
        sorted.x[to] = block.x[r]!;
        sorted.y[to] = block.y[r]!;
        if (deep) sorted.z[to] = block.z[r]!;
      }
    }
  }
  return sorted;
}
