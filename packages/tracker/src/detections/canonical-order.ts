import type { DetectionBlock } from '../core/columns.js';

/** Buckets with more rows than this are merge-sorted instead of insertion-sorted (measured: 16 to 64 do alike). */
const LARGE_BUCKET = 32;

/** Puts rows `from` .. `to - 1` of a block, one frame, in canonical order, in place. */
export type FrameSorter = (block: DetectionBlock, from: number, to: number) => void;

/**
 * Makes a sorter with scratch of its own, grown to the largest frame it sees (24 bytes a row).
 *
 * Canonical order: ascending y, then x, then z. It depends on the positions alone, so that no later result
 * depends on the order of rows in the dump; scaling by powers of two keeps it. Positions are distinct after
 * reading, but two of them may fall together when calibration rounds them: brightness and then the given
 * pathline decide, and rows that agree in all of these differ in `row` only.
 *
 * Method: rows are counted into as many equal slices of y as there are rows, then sorted inside each slice.
 * Cost: O(n) for positions spread over the frame (about 40 ns a row at 10 000 rows), O(n log n) at worst, as
 * when all rows share one y. All columns move together.
 */
export function createFrameSorter(): FrameSorter {
  let order = new Uint32Array(0);
  let other = new Uint32Array(0);
  let slice = new Uint32Array(0);
  let first = new Uint32Array(1);
  let kept64 = new Float64Array(0);
  let kept32 = new Float32Array(0);
  let keptInt = new Int32Array(0);

  return (block, from, to) => {
    const n = to - from;
    if (n < 2) return;
    if (order.length < n) {
      const room = Math.max(n, 2 * order.length);
      order = new Uint32Array(room);
      other = new Uint32Array(room);
      slice = new Uint32Array(room);
      first = new Uint32Array(room + 1);
      kept64 = new Float64Array(room);
      kept32 = new Float32Array(block.brightness.length > 0 ? room : 0);
      keptInt = new Int32Array(block.given.length > 0 ? room : 0);
    }
    sliceByY(block.y, from, n, slice, first, order);
    sortSlices(block, n, first, order, other);
    gather(block.y, from, order, n, kept64);
    gather(block.x, from, order, n, kept64);
    if (block.dims === 3) gather(block.z, from, order, n, kept64);
    gather(block.row, from, order, n, kept64);
    if (block.brightness.length > 0) {
      if (kept32.length < n) kept32 = new Float32Array(order.length);
      gather(block.brightness, from, order, n, kept32);
    }
    if (block.given.length > 0) {
      if (keptInt.length < n) keptInt = new Int32Array(order.length);
      gather(block.given, from, order, n, keptInt);
    }
  };
}

/** Counting sort of the rows by slice of y: `order` holds rows, `first[s] .. first[s + 1]` those of slice s. */
function sliceByY(
  y: Float64Array,
  from: number,
  n: number,
  slice: Uint32Array,
  first: Uint32Array,
  order: Uint32Array,
): void {
  let low = y[from]!;
  let high = low;
  for (let i = from + 1; i < from + n; i++) {
    const value = y[i]!;
    if (value < low) low = value;
    if (value > high) high = value;
  }
  // Subtraction, product and truncation are each monotone, so slices ascend with y whatever the rounding. Where
  // high - low is 0, overflows, or is so small that its inverse does, all products are 0, NaN or infinite, which
  // `>>> 0` makes slice 0: one slice, sorted by comparison.
  const perLength = (n - 1) / (high - low);
  first.fill(0, 0, n + 1);
  for (let i = 0; i < n; i++) {
    const s = ((y[from + i]! - low) * perLength) >>> 0;
    slice[i] = s;
    first[s + 1] = first[s + 1]! + 1;
  }
  for (let s = 0; s < n; s++) first[s + 1] = first[s + 1]! + first[s]!;
  // Filled from the back of each slice, which leaves `first[s]` at its start again.
  for (let i = n - 1; i >= 0; i--) {
    const s = slice[i]! + 1;
    const at = first[s]! - 1;
    first[s] = at;
    order[at] = from + i;
  }
  for (let s = 0; s < n; s++) first[s] = first[s + 1]!;
  first[n] = n;
}

function sortSlices(block: DetectionBlock, n: number, first: Uint32Array, order: Uint32Array, other: Uint32Array) {
  const { y } = block;
  for (let s = 0; s < n; s++) {
    const start = first[s]!;
    const end = first[s + 1]!;
    if (end - start < 2) continue;
    if (end - start > LARGE_BUCKET) {
      mergeSort(block, order, other, start, end);
      continue;
    }
    for (let i = start + 1; i < end; i++) {
      const row = order[i]!;
      const value = y[row]!;
      let j = i - 1;
      while (j >= start && (y[order[j]!]! > value || (y[order[j]!]! === value && before(block, row, order[j]!)))) {
        order[j + 1] = order[j]!;
        j--;
      }
      order[j + 1] = row;
    }
  }
}

/** True where row a stands strictly before row b. */
function before(block: DetectionBlock, a: number, b: number): boolean {
  const { y, x, z, brightness, given } = block;
  if (y[a]! !== y[b]!) return y[a]! < y[b]!;
  if (x[a]! !== x[b]!) return x[a]! < x[b]!;
  if (z.length > 0 && z[a]! !== z[b]!) return z[a]! < z[b]!;
  if (brightness.length > 0 && brightness[a]! !== brightness[b]!) {
    if (brightness[a]! < brightness[b]!) return true;
    if (brightness[a]! > brightness[b]!) return false;
    // One or both are NaN: it stands last.
    const aMissing = Number.isNaN(brightness[a]!);
    if (aMissing !== Number.isNaN(brightness[b]!)) return !aMissing;
  }
  return given.length > 0 && given[a]! < given[b]!;
}

/** Bottom-up merge sort of order[start .. end - 1]; stable, and never quadratic. */
function mergeSort(block: DetectionBlock, order: Uint32Array, other: Uint32Array, start: number, end: number): void {
  let source = order;
  let target = other;
  for (let width = 1; width < end - start; width *= 2) {
    for (let left = start; left < end; left += 2 * width) {
      const middle = Math.min(left + width, end);
      const right = Math.min(left + 2 * width, end);
      let a = left;
      let b = middle;
      for (let i = left; i < right; i++) {
        const takeRight = a >= middle || (b < right && before(block, source[b]!, source[a]!));
        target[i] = source[takeRight ? b++ : a++]!;
      }
    }
    const swap = source;
    source = target;
    target = swap;
  }
  if (source !== order) order.set(source.subarray(start, end), start);
}

/** column[from + i] becomes the value at order[i]. */
function gather<T extends Float64Array | Float32Array | Int32Array>(
  column: T,
  from: number,
  order: Uint32Array,
  n: number,
  kept: T,
): void {
  for (let i = 0; i < n; i++) kept[i] = column[order[i]!]!;
  for (let i = 0; i < n; i++) column[from + i] = kept[i]!;
}
