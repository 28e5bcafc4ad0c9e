import type { RowReason, SetAside } from './dump.js';

/** How many rows set aside for one reason are named by place. */
const NAMED_ROWS = 5;

/** Longest piece of a file quoted in a message. */
const QUOTED = 60;

interface Entry {
  count: number;
  readonly examples: { readonly file: string; readonly line: number; readonly found: string }[];
}

/** The book of one pass over a dump: rows present, rows set aside by reason with the first few named. */
export class RowLedger {
  /** Data rows met so far, over all files. */
  rowsPresent = 0;
  readonly #entries = new Map<RowReason, Entry>();

  /** Counts one row set aside. `found` is called only for the few rows that are named. */
  setAside(reason: RowReason, file: string, line: number, found: () => string): void {
    let entry = this.#entries.get(reason);
    if (entry === undefined) {
      entry = { count: 0, examples: [] };
      this.#entries.set(reason, entry);
    }
    entry.count++;
    if (entry.examples.length < NAMED_ROWS) entry.examples.push({ file, line, found: found() });
  }

  /** Forgets a reason that a later step counts anew. */
  forget(reason: RowReason): void {
    this.#entries.delete(reason);
  }

  count(reason?: RowReason): number {
    if (reason !== undefined) return this.#entries.get(reason)?.count ?? 0;
    let total = 0;
    for (const entry of this.#entries.values()) total += entry.count;
    return total;
  }

  /** Sorted by reason, so that equal dumps give equal records. */
  list(): SetAside[] {
    return [...this.#entries]
      .map(([reason, entry]) => ({ reason, count: entry.count, examples: [...entry.examples] }))
      .sort((a, b) => (a.reason < b.reason ? -1 : 1));
  }
}

/** A place in a dump for messages: `run.csv line 12`, or only the file where there are no lines. */
export function place(file: string, line: number): string {
  return line > 0 ? `${file} line ${line}` : file;
}

/** Bytes of a dump as printable text, cut to a length that suits a message. */
export function quote(bytes: Uint8Array): string {
  const cut = bytes.length > QUOTED;
  let text = '';
  for (const byte of cut ? bytes.subarray(0, QUOTED) : bytes) {
    text += byte >= 32 && byte < 127 ? String.fromCharCode(byte) : `\\x${byte.toString(16).padStart(2, '0')}`;
  }
  return `"${text}${cut ? '...' : ''}"`;
}
