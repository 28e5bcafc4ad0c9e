/** Bytes that text dumps are made of. */
export const BYTE = {
  tab: 9,
  lineFeed: 10,
  return: 13,
  blank: 32,
  quote: 34,
  hash: 35,
  comma: 44,
  point: 46,
  semicolon: 59,
} as const;

/**
 * Where the fields of one line lie, as pairs start, end. `end` is the end of the line without its line feed; a
 * carriage return before it is left out. With `separator` blank any run of blanks and tabs parts two fields. A
 * separator within double quotes parts nothing. Cost: one look at each byte; for heads and bad lines, not for bulk.
 */
export function splitFields(bytes: Uint8Array, start: number, end: number, separator: number): number[] {
  let last = end;
  if (last > start && bytes[last - 1] === BYTE.return) last--;
  const blankSeparated = separator === BYTE.blank;
  const parts = (byte: number) => byte === separator || (blankSeparated && byte === BYTE.tab);
  let at = start;
  if (blankSeparated) {
    while (at < last && parts(bytes[at])) at++;
    while (last > at && parts(bytes[last - 1])) last--;
    if (at === last) return [];
  }
  const fields: number[] = [];
  for (;;) {
    const fieldStart = at;
    at = fieldEnd(bytes, at, last, separator);
    fields.push(fieldStart, at);
    if (at >= last) return fields;
    at++;
    if (blankSeparated) while (at < last && parts(bytes[at])) at++;
  }
}

/** End of the field that starts at `start`: the next separator outside quotes, or `end`. */
export function fieldEnd(bytes: Uint8Array, start: number, end: number, separator: number): number {
  let at = start;
  while (at < end && bytes[at] === BYTE.blank && separator !== BYTE.blank) at++;
  if (at < end && bytes[at] === BYTE.quote) {
    let close = at + 1;
    while (close < end && bytes[close] !== BYTE.quote) close++;
    // A quote that never closes is an ordinary byte: it must not swallow the separators behind it.
    if (close < end) at = close + 1;
  }
  while (at < end && bytes[at] !== separator && !(separator === BYTE.blank && bytes[at] === BYTE.tab)) at++;
  return at;
}

/** Field bytes as a name: UTF-8, trimmed, without a pair of quotes. */
export function fieldText(bytes: Uint8Array, start: number, end: number): string {
  const text = new TextDecoder().decode(bytes.subarray(start, end)).trim();
  return text.length >= 2 && text.startsWith('"') && text.endsWith('"') ? text.slice(1, -1).trim() : text;
}
