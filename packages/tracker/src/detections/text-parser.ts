import { parseNumberInto } from './number-text.js';
import { BATCH_ROWS, ROLE, ROLES, type RowBatch } from './row-batch.js';
import { quote, type RowLedger } from './row-ledger.js';
import { BYTE, fieldEnd, fieldText, splitFields } from './text-fields.js';
import type { TextLayout } from './text-layout.js';

/** Powers of ten of the fast path: at most 9 digits after the mark. */
const POWERS = Float64Array.from({ length: 10 }, (_, exponent) => Number(`1e${exponent}`));

/**
 * Turns lines of bytes into rows of numbers: the inner loop of reading text. It keeps its place between calls, so
 * that a batch may end in the middle of a buffer.
 *
 * Bytes are looked at once. A number of at most 9 digits before and after the mark and 15 in all is gathered in two
 * 32-bit integers and divided once by an exact power of ten, which gives the nearest Float64 (Clinger 1990,
 * doi:10.1145/93542.93557); anything else goes to `parseNumberInto`. A line that does not fit is looked at again,
 * slowly, to find out why, and set aside with its reason. Cost: about 2 ns a byte.
 */
export class TextParser {
  /** Next byte to look at. */
  position = 0;
  /** Lines passed so far. */
  line = 0;
  readonly #layout: TextLayout;
  readonly #file: string;
  readonly #ledger: RowLedger;
  /** Column of the batch that a field goes to, the last one being a bin for fields nobody wants. [fields + 1] */
  readonly #role: Uint8Array;
  readonly #names: string[];
  readonly #value = new Float64Array(1);

  /** `index`: 0-based field of each role, -1 for none (see ColumnPlan). */
  constructor(layout: TextLayout, index: Int32Array, file: string, ledger: RowLedger) {
    this.#layout = layout;
    this.#file = file;
    this.#ledger = ledger;
    this.#role = new Uint8Array(layout.fields + 1).fill(ROLES.length);
    this.#names = Array.from({ length: layout.fields }, (_, field) => `field ${field + 1}`);
    for (const [role, field] of index.entries()) {
      if (field < 0) continue;
      this.#role[field] = role;
      this.#names[field] = ROLES[role];
    }
  }

  /** Skips the header line: everything up to and including the first line that is neither blank nor a comment. */
  skipHeader(bytes: Uint8Array, end: number): void {
    while (this.position < end) {
      let at = this.position;
      while (bytes[at] === BYTE.blank || bytes[at] === BYTE.tab || bytes[at] === BYTE.return) at++;
      const content = bytes[at] !== BYTE.lineFeed && bytes[at] !== BYTE.hash;
      this.position = bytes.indexOf(BYTE.lineFeed, at) + 1;
      this.line++;
      if (content) return;
    }
  }

  /**
   * Appends rows of `bytes[position .. end - 1]` to the batch until it is full or the bytes are used up.
   * `bytes[end - 1]` must be a line feed. Borrowed: nothing is kept.
   */
  parse(bytes: Uint8Array, end: number, batch: RowBatch): void {
    const separator = this.#layout.separator;
    const decimal = this.#layout.decimal;
    const fields = this.#layout.fields;
    const blankSeparated = separator === BYTE.blank;
    // A tab is a blank unless it separates.
    const tab = separator === BYTE.tab ? BYTE.blank : BYTE.tab;
    const roles = this.#role;
    const columns = batch.columns;
    const bin = ROLES.length;
    const ledger = this.#ledger;
    const lineOf = batch.line;
    const rowOf = batch.row;
    let at = this.position;
    let line = this.line;
    let n = batch.rows;

    while (at < end && n < BATCH_ROWS) {
      const lineStart = at;
      line++;
      let byte = bytes[at];
      while (byte === 32 || byte === tab) byte = bytes[++at];
      if (byte === 10) {
        at++;
        continue;
      }
      if (byte === 35) {
        at = bytes.indexOf(10, at) + 1;
        continue;
      }
      if (byte === 13 && bytes[at + 1] === 10) {
        at += 2;
        continue;
      }

      let field = 0;
      let whole = false;
      for (;;) {
        const role = roles[field];
        if (role !== bin) {
          const start = at;
          let negative = false;
          if (byte === 45) {
            negative = true;
            byte = bytes[++at];
          }
          let digitsAt = at;
          let integer = 0;
          let digit = byte - 48;
          while (digit >= 0 && digit < 10) {
            integer = (Math.imul(integer, 10) + digit) | 0;
            byte = bytes[++at];
            digit = byte - 48;
          }
          let digits = at - digitsAt;
          let value = integer;
          let fast = digits > 0 && digits < 10;
          if (byte === decimal) {
            byte = bytes[++at];
            digitsAt = at;
            let fraction = 0;
            digit = byte - 48;
            while (digit >= 0 && digit < 10) {
              fraction = (Math.imul(fraction, 10) + digit) | 0;
              byte = bytes[++at];
              digit = byte - 48;
            }
            const places = at - digitsAt;
            digits += places;
            fast = fast && places < 10 && digits < 16;
            if (fast) value = (integer * POWERS[places] + fraction) / POWERS[places];
          }
          if (fast && (byte === separator || byte === 10 || byte === 13 || byte === 32 || byte === tab)) {
            columns[role][n] = negative ? -value : value;
          } else {
            at = this.#slowField(bytes, start, end, columns[role], role, n);
            if (at < 0) break;
            byte = bytes[at];
          }
        } else if (byte === 34) {
          at = this.#fieldEnd(bytes, at, end);
          byte = bytes[at];
        } else {
          while (byte !== separator && byte !== 10 && !(blankSeparated && byte === 9)) byte = bytes[++at];
        }

        // Now at the separator, at blanks before it, or at the end of the line.
        if (blankSeparated) {
          if (byte === 32 || byte === 9) {
            do byte = bytes[++at];
            while (byte === 32 || byte === 9);
            if (byte !== 10 && !(byte === 13 && bytes[at + 1] === 10)) {
              if (++field >= fields) break;
              continue;
            }
          }
        } else {
          while (byte === 32 || byte === tab) byte = bytes[++at];
          if (byte === separator) {
            byte = bytes[++at];
            while (byte === 32 || byte === tab) byte = bytes[++at];
            if (++field >= fields) break;
            continue;
          }
        }
        if (byte === 13 && bytes[at + 1] === 10) byte = bytes[++at];
        whole = byte === 10 && field === fields - 1;
        break;
      }
      if (whole) {
        lineOf[n] = line;
        rowOf[n] = ledger.rowsPresent++;
        n++;
        at++;
      } else at = this.#setAside(bytes, lineStart, line);
    }
    this.position = at;
    this.line = line;
    batch.rows = n;
  }

  /**
   * A field that the fast path could not take. Returns where it ends, or -1 when it is no number. An empty one stands
   * for a missing value (NaN) where the role is not needed for a detection.
   */
  #slowField(bytes: Uint8Array, start: number, end: number, column: Float64Array, role: number, n: number): number {
    const stop = this.#fieldEnd(bytes, start, end);
    if (parseNumberInto(bytes, start, stop, this.#layout.decimal, column, n)) return stop;
    if (!mayBeMissing(role)) return -1;
    for (let i = start; i < stop; i++) if (bytes[i] !== 32 && bytes[i] !== 9) return -1;
    column[n] = Number.NaN;
    return stop;
  }

  /** Where the field ends: at the separator, at a blank that parts fields, or at the end of the line. */
  #fieldEnd(bytes: Uint8Array, start: number, end: number): number {
    const separator = this.#layout.separator;
    const blankSeparated = separator === BYTE.blank;
    let at = start;
    if (bytes[at] === 34) {
      let lineEnd = bytes.indexOf(10, start);
      if (lineEnd > start && bytes[lineEnd - 1] === 13) lineEnd--;
      return fieldEnd(bytes, start, Math.min(lineEnd, end), separator);
    }
    let byte = bytes[at];
    while (byte !== separator && byte !== 10 && !(blankSeparated && byte === 9)) byte = bytes[++at];
    return byte === 10 && at > start && bytes[at - 1] === 13 ? at - 1 : at;
  }

  /** Finds out what is wrong with a line, books it, and returns where the next line starts. */
  #setAside(bytes: Uint8Array, lineStart: number, line: number): number {
    const lineEnd = bytes.indexOf(10, lineStart);
    // The inner loop does not see through leading tabs that separate, nor through stray carriage returns.
    let at = lineStart;
    while (bytes[at] === 32 || bytes[at] === 9 || bytes[at] === 13) at++;
    if (at >= lineEnd || bytes[at] === 35) return lineEnd + 1;
    this.#ledger.rowsPresent++;
    const { separator, fields, decimal } = this.#layout;
    const split = splitFields(bytes, lineStart, lineEnd, separator);
    if (split.length !== 2 * fields) {
      const found = () =>
        `${split.length / 2} fields instead of ${fields}: ${quote(bytes.subarray(lineStart, lineEnd))}`;
      this.#ledger.setAside('wrong-field-count', this.#file, line, found);
      return lineEnd + 1;
    }
    let bad = 0;
    while (bad < fields - 1) {
      const role = this.#role[bad];
      const good =
        role === ROLES.length ||
        parseNumberInto(bytes, split[2 * bad], split[2 * bad + 1], decimal, this.#value, 0) ||
        (mayBeMissing(role) && fieldText(bytes, split[2 * bad], split[2 * bad + 1]) === '');
      if (!good) break;
      bad++;
    }
    const found = () => `${this.#names[bad]} is ${quote(bytes.subarray(split[2 * bad], split[2 * bad + 1]))}`;
    this.#ledger.setAside('not-a-number', this.#file, line, found);
    return lineEnd + 1;
  }
}

/** A detection needs no brightness and no pathline number: an empty field there is a missing value. */
function mayBeMissing(role: number): boolean {
  return role === ROLE.brightness || role === ROLE.pathline;
}
