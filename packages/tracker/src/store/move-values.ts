import type { Column } from './spill.js';

/**
 * Loops that move values of a column about, one for each width of value: a loop that meets arrays of four types does each
 * step about twice as slowly as one that meets a single type. Values are moved as they stand.
 */

/** Value i of `source` goes to `target[to[i]]`, for i below `rows`; where `to` is negative it goes nowhere. */
export function scatterValues(source: Column, to: Int32Array, rows: number, target: Column): void {
  if (source.BYTES_PER_ELEMENT === 8) scatter8(source as Float64Array, to, rows, target as Float64Array);
  else if (source.BYTES_PER_ELEMENT === 4) scatter4(words(source), to, rows, words(target));
  else scatter2(source as Uint16Array, to, rows, target as Uint16Array);
}

/** `target[i]` becomes `source[from[i]]`, for i below `rows`. */
export function gatherValues(source: Column, from: Int32Array, rows: number, target: Column): void {
  if (source.BYTES_PER_ELEMENT === 8) gather8(source as Float64Array, from, rows, target as Float64Array);
  else if (source.BYTES_PER_ELEMENT === 4) gather4(words(source), from, rows, words(target));
  else gather2(source as Uint16Array, from, rows, target as Uint16Array);
}

/** The same memory as 32-bit whole numbers. */
function words(column: Column): Int32Array {
  return column instanceof Int32Array ? column : new Int32Array(column.buffer, column.byteOffset, column.length);
}

function scatter8(source: Float64Array, to: Int32Array, rows: number, target: Float64Array): void {
  for (let i = 0; i < rows; i++) if (to[i] >= 0) target[to[i]] = source[i];
}

function scatter4(source: Int32Array, to: Int32Array, rows: number, target: Int32Array): void {
  for (let i = 0; i < rows; i++) if (to[i] >= 0) target[to[i]] = source[i];
}

function scatter2(source: Uint16Array, to: Int32Array, rows: number, target: Uint16Array): void {
  for (let i = 0; i < rows; i++) if (to[i] >= 0) target[to[i]] = source[i];
}

function gather8(source: Float64Array, from: Int32Array, rows: number, target: Float64Array): void {
  for (let i = 0; i < rows; i++) target[i] = source[from[i]];
}

function gather4(source: Int32Array, from: Int32Array, rows: number, target: Int32Array): void {
  for (let i = 0; i < rows; i++) target[i] = source[from[i]];
}

function gather2(source: Uint16Array, from: Int32Array, rows: number, target: Uint16Array): void {
  for (let i = 0; i < rows; i++) target[i] = source[from[i]];
}
