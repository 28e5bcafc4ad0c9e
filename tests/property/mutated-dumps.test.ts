import { gunzipSync, gzipSync } from 'node:zlib';
import { isWakeloomError } from '@wakeloom/tracker';
import { parquetWriteBuffer } from 'hyparquet-writer';
import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import { describe, expect, it } from 'vitest';
import { type DumpOptions, flatRows, memorySource, type ReadDump, readDump } from '../helpers/dump-sources.js';

/** 300 dumps in all, each from its own seed, so that a failing one can be run alone. */
const CASES = { text: 140, gzip: 60, npy: 60, parquet: 40 };

/** A share of 1 lets every dump through that holds a single good row: the books must then balance. */
const LENIENT: DumpOptions = { badRowsLimit: 1 };

class Dice {
  readonly #random;
  constructor(seed: number) {
    this.#random = xoroshiro128plus(seed);
  }
  /** Whole number from 0 to below `n`. */
  below(n: number): number {
    return uniformInt(this.#random, 0, n - 1);
  }
  of<T>(values: readonly T[]): T {
    return values[this.below(values.length)];
  }
}

const table = (dice: Dice, rows: number) =>
  Array.from({ length: rows }, (_, i) => [
    i >> 3,
    dice.below(1_280_000) / 1000,
    dice.below(1_024_000) / 1000,
    dice.below(256),
  ]);

interface TextForm {
  readonly header: boolean;
  readonly write: (row: readonly number[]) => string;
  readonly end: string;
  readonly options: DumpOptions;
}

/** Header and columns are told, so that the number of rows present can be counted from outside. */
const byPosition = { columns: { frame: 0, x: 1, y: 2, brightness: 3 } } as const;
const FORMS: readonly TextForm[] = [
  { header: true, write: (row) => row.join(','), end: '\n', options: { header: 'yes', ...byPosition } },
  { header: false, write: (row) => row.join(','), end: '\r\n', options: { header: 'no', ...byPosition } },
  { header: false, write: (row) => row.join('   '), end: '\n', options: { header: 'no', ...byPosition } },
  {
    header: true,
    write: (row) => row.join(';').replaceAll('.', ','),
    end: '\r\n',
    options: { header: 'yes', ...byPosition },
  },
  { header: true, write: (row) => row.join('\t'), end: '\n', options: { header: 'yes', ...byPosition } },
];

const ABSURD = [
  '1e400',
  '-1e400',
  '99999999999999999999',
  '3000000000',
  '0.5',
  'NaN',
  'inf',
  '',
  '0x1F',
  '1e-400',
  '-',
  '"',
  '1,2,3',
  '#',
  '\u00b5',
  '1.5.5',
];

/** Bytes flipped, lines cut, numbers made absurd, files truncated: one to three of these at seeded places. */
function mutate(bytes: Uint8Array, dice: Dice, text: boolean): Uint8Array {
  let result = Uint8Array.from(bytes);
  for (let turn = 1 + dice.below(3); turn > 0 && result.length > 0; turn--) {
    const at = dice.below(result.length);
    const kind = dice.below(text ? 5 : 3);
    if (kind === 0) {
      for (let n = 1 + dice.below(12); n > 0; n--) result[dice.below(result.length)] ^= 1 << dice.below(8);
    } else if (kind === 1) result = result.slice(0, at);
    else if (kind === 2) {
      // A piece lost from the middle, as from a disk with a bad block.
      const length = Math.min(result.length - at, 1 + dice.below(60));
      result = Uint8Array.from([...result.subarray(0, at), ...result.subarray(at + length)]);
    } else if (kind === 3) {
      const end = result.indexOf(10, at);
      if (end >= 0) result = Uint8Array.from([...result.subarray(0, at), ...result.subarray(end)]);
    } else {
      const lines = Buffer.from(result).toString('latin1').split('\n');
      for (let n = 1 + dice.below(20); n > 0; n--) {
        const line = dice.below(lines.length);
        const parts = lines[line].split(/([,;\t ]+)/);
        parts[2 * dice.below((parts.length + 1) / 2)] = dice.of(ABSURD);
        lines[line] = parts.join('');
      }
      result = Uint8Array.from(Buffer.from(lines.join('\n'), 'latin1'));
    }
  }
  return result;
}

/** Rows of a text counted without the program: lines that hold something but no comment, less the header. */
function countRows(bytes: Uint8Array, header: boolean): number {
  const lines = Buffer.from(bytes)
    .toString('latin1')
    .split('\n')
    .filter((line) => !/^[ \t\r]*(#|$)/.test(line));
  return Math.max(0, lines.length - (header ? 1 : 0));
}

/** The dump read, or null when it was refused with a code; anything else thrown fails the test. */
async function attempt(name: string, bytes: Uint8Array, options: DumpOptions): Promise<ReadDump | null> {
  try {
    return await readDump([memorySource(name, bytes)], { ...LENIENT, ...options });
  } catch (error) {
    if (isWakeloomError(error) && error.code.startsWith('dump/')) {
      expect(error.message).toContain(name);
      return null;
    }
    throw error;
  }
}

function checkBooks({ scan, blocks }: ReadDump): void {
  const aside = scan.setAside.reduce((sum, { count }) => sum + count, 0);
  expect(scan.rowsRead + aside).toBe(scan.rowsPresent);
  const rows = flatRows(blocks);
  expect(rows).toHaveLength(scan.rowsRead);
  expect(scan.frameCounts.reduce((sum, count) => sum + count, 0)).toBe(scan.rowsRead);
  let last = Number.NEGATIVE_INFINITY;
  const seen = new Set<number>();
  for (const [frame, x, y, , , row] of rows) {
    if (!(frame >= last && Number.isFinite(x) && Number.isFinite(y) && row >= 0 && row < scan.rowsPresent)) {
      throw new Error(`row ${row} of frame ${frame} at (${x}, ${y}) after frame ${last}`);
    }
    last = frame;
    seen.add(row);
  }
  expect(seen.size).toBe(rows.length);
}

describe('mutated dumps are read with balanced books or refused with a code', () => {
  it(`text, ${CASES.text} of them`, async () => {
    let read = 0;
    let withBadRows = 0;
    for (let seed = 0; seed < CASES.text; seed++) {
      const dice = new Dice(1000 + seed);
      const form = FORMS[seed % FORMS.length];
      const lines = table(dice, 400).map(form.write);
      if (form.header) lines.unshift('frame,x,y,intensity'.replaceAll(',', form.write([0, 0]).replaceAll('0', '')));
      const bytes = mutate(new TextEncoder().encode(lines.join(form.end) + form.end), dice, true);
      const result = await attempt(`seed-${seed}.csv`, bytes, form.options);
      if (result === null) continue;
      checkBooks(result);
      expect(result.scan.rowsPresent, `seed ${seed}`).toBe(countRows(bytes, form.header));
      read++;
      if (result.scan.setAside.length > 0) withBadRows++;
    }
    // Most mutations spoil rows, not files.
    expect(read).toBeGreaterThan(CASES.text * 0.8);
    expect(withBadRows).toBeGreaterThan(CASES.text * 0.4);
  });

  it(`gzip, ${CASES.gzip} of them`, async () => {
    let read = 0;
    let refused = 0;
    for (let seed = 0; seed < CASES.gzip; seed++) {
      const dice = new Dice(2000 + seed);
      const form = FORMS[seed % 2];
      const lines = table(dice, 400).map(form.write);
      if (form.header) lines.unshift('frame,x,y,intensity');
      const text = new TextEncoder().encode(lines.join(form.end) + form.end);
      // Spoiled before packing, or the packed file spoiled.
      const bytes = seed % 3 === 0 ? gzipSync(mutate(text, dice, true)) : mutate(gzipSync(text), dice, false);
      const result = await attempt(`seed-${seed}.csv.gz`, bytes, form.options);
      if (result === null) {
        refused++;
        continue;
      }
      checkBooks(result);
      // A spoiled magic number makes a text file of it.
      const unpacked = bytes[0] === 0x1f && bytes[1] === 0x8b ? gunzipSync(bytes) : bytes;
      expect(result.scan.rowsPresent, `seed ${seed}`).toBe(countRows(unpacked, form.header));
      read++;
    }
    expect(read).toBeGreaterThan(CASES.gzip * 0.25);
    expect(refused).toBeGreaterThan(CASES.gzip * 0.5);
  });

  it(`NPY, ${CASES.npy} of them`, async () => {
    let read = 0;
    let refused = 0;
    for (let seed = 0; seed < CASES.npy; seed++) {
      const dice = new Dice(3000 + seed);
      const header = `{'descr': '<f8', 'fortran_order': False, 'shape': (400, 4), }`;
      const bytes = new Uint8Array(128 + 400 * 32);
      for (const [i, c] of [...`\x93NUMPY\x01\x00v\x00${header.padEnd(117)}\n`].entries()) bytes[i] = c.charCodeAt(0);
      new Float64Array(bytes.buffer, 128).set(table(dice, 400).flat());
      // A third spoiled in the header, a third in the numbers, a third anywhere.
      const place = seed % 3;
      let spoiled = mutate(bytes, dice, false);
      if (place === 0)
        spoiled = Uint8Array.from([...mutate(bytes.subarray(0, 128), dice, false), ...bytes.subarray(128)]);
      else if (place === 1) {
        spoiled = Uint8Array.from(bytes);
        for (let n = 0; n < 40; n++) spoiled[128 + dice.below(400 * 32)] ^= 1 << dice.below(8);
      }
      const result = await attempt(`seed-${seed}.npy`, spoiled, byPosition);
      if (result === null) refused++;
      else {
        checkBooks(result);
        read++;
        if (place === 1) expect(result.scan.rowsPresent).toBe(400);
      }
    }
    expect(read).toBeGreaterThan(CASES.npy * 0.3);
    expect(refused).toBeGreaterThan(CASES.npy * 0.3);
  });

  it(`Parquet, ${CASES.parquet} of them`, async () => {
    let read = 0;
    let refused = 0;
    for (let seed = 0; seed < CASES.parquet; seed++) {
      const dice = new Dice(4000 + seed);
      const rows = table(dice, 400);
      const names = ['frame', 'x', 'y', 'intensity'];
      const columnData = names.map((name, c) => ({
        name,
        data: rows.map((row) => row[c]),
        type: c === 0 ? ('INT32' as const) : ('DOUBLE' as const),
      }));
      const codec = seed % 2 === 0 ? 'SNAPPY' : 'UNCOMPRESSED';
      const bytes = new Uint8Array(parquetWriteBuffer({ columnData, codec, rowGroupSize: 150 }));
      let spoiled = mutate(bytes, dice, false);
      if (seed % 4 === 0) {
        spoiled = Uint8Array.from(bytes);
        for (let n = 0; n < 3; n++) spoiled[4 + dice.below(bytes.length - 8)] ^= 1 << dice.below(8);
      }
      const result = await attempt(`seed-${seed}.parquet`, spoiled, {});
      if (result === null) refused++;
      else {
        checkBooks(result);
        read++;
      }
    }
    expect(read + refused).toBe(CASES.parquet);
    expect(refused).toBeGreaterThan(CASES.parquet * 0.3);
    expect(read).toBeGreaterThan(0);
  });
});
