import type { LinkedBlock } from '../core/columns.js';
import { rowCount } from '../core/columns.js';
import type { FitSpace } from './fit-space.js';

/** Rows of a window sorted by pathline, each pathline in frame order. */
export interface PathlineOrder {
  /** Pathlines in the window, numbered in order of appearance. */
  readonly count: number;
  /** First entry of each pathline in `row`. [count + 1] */
  readonly start: Uint32Array;
  /** Row of the window. [linked rows] */
  readonly row: Uint32Array;
  /** Most samples of one pathline. */
  readonly longest: number;
}

/**
 * Sorts the linked rows of a window by pathline: a counting sort, with the pathline numbers made small through an
 * open-addressing table (they may be far apart in a long run, so a table by number would grow with the run).
 * Cost O(rows); 8 bytes a row of `space`, to which `row` belongs.
 */
export function pathlineOrder(window: LinkedBlock, space: FitSpace): PathlineOrder {
  const rows = rowCount(window);
  const { pathline } = window;
  const slotOf = space.int32('slot', rows);
  let size = 1024;
  while (size < 2 * rows) size *= 2;
  // At most as many pathlines as rows, but usually a few per cent of them: grow when half full.
  size = Math.min(size, 1 << 16);
  let keys = new Int32Array(size).fill(-1);
  let slots = new Int32Array(size);
  let counts = new Uint32Array(1024);
  let count = 0;
  for (let r = 0; r < rows; r++) {
    const id = pathline[r]!;
    if (id < 0) {
      slotOf[r] = -1;
      continue;
    }
    let at = hash(id) & (size - 1);
    while (keys[at] !== id && keys[at] !== -1) at = (at + 1) & (size - 1);
    if (keys[at] === -1) {
      if (count * 2 >= size) {
        size *= 4;
        const wider = new Int32Array(size).fill(-1);
        const moved = new Int32Array(size);
        for (let old = 0; old < keys.length; old++) {
          const key = keys[old]!;
          if (key === -1) continue;
          let to = hash(key) & (size - 1);
          while (wider[to] !== -1) to = (to + 1) & (size - 1);
          wider[to] = key;
          moved[to] = slots[old]!;
        }
        keys = wider;
        slots = moved;
        at = hash(id) & (size - 1);
        while (keys[at] !== -1) at = (at + 1) & (size - 1);
      }
      if (count >= counts.length) {
        const wider = new Uint32Array(counts.length * 2);
        wider.set(counts);
        counts = wider;
      }
      keys[at] = id;
      slots[at] = count++;
    }
    const slot = slots[at]!;
    slotOf[r] = slot;
    counts[slot] = counts[slot]! + 1;
  }
  const start = new Uint32Array(count + 1);
  let longest = 0;
  for (let slot = 0; slot < count; slot++) {
    const n = counts[slot]!;
    if (n > longest) longest = n;
    start[slot + 1] = start[slot]! + n;
  }
  const next = start.slice();
  const row = space.uint32('row', start[count]!);
  for (let r = 0; r < rows; r++) {
    const slot = slotOf[r]!;
    if (slot < 0) continue;
    const to = next[slot]!;
    row[to] = r;
    next[slot] = to + 1;
  }
  return { count, start, row, longest };
}

/** Multiplicative hash: odd constant near 2^32 over the golden ratio (Knuth, TAOCP 3, section 6.4). */
function hash(id: number): number {
  const mixed = Math.imul(id, 0x9e3779b1);
  return mixed ^ (mixed >>> 15);
}
