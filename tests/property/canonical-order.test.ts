import type { DetectionBlock } from '@wakeloom/tracker';
import { createFrameSorter } from '@wakeloom/tracker/detections/canonical-order';
import { describe, expect, it } from 'vitest';
import { blockOf, copyBlock, randomBlock, shuffled, uniform } from '../helpers/detections.js';

function sorted(block: DetectionBlock): DetectionBlock {
  const copy = copyBlock(block);
  const sort = createFrameSorter();
  for (let k = 0; k < copy.number.length; k++) sort(copy, copy.offsets[k]!, copy.offsets[k + 1]!);
  return copy;
}

/** Bits of every column but `row`, one string: comparing it is cheap. */
function columnsOf({ x, y, z, brightness, given }: DetectionBlock): string {
  return [x, y, z, brightness, given]
    .map((column) => Buffer.from(column.buffer, column.byteOffset, column.byteLength).toString('base64'))
    .join(' ');
}

/** Plain comparison sort of the same frame: the oracle. */
function oracle(block: DetectionBlock, from: number, to: number): number[] {
  const rows = Array.from({ length: to - from }, (_, i) => from + i);
  return rows.sort(
    (a, b) =>
      block.y[a]! - block.y[b]! ||
      block.x[a]! - block.x[b]! ||
      (block.dims === 3 ? block.z[a]! - block.z[b]! : 0) ||
      block.brightness[a]! - block.brightness[b]! ||
      block.given[a]! - block.given[b]!,
  );
}

/** Shapes of a frame that a sort by slices finds hard. */
const SHAPES: Record<string, (block: DetectionBlock, random: () => number) => void> = {
  uniform: () => {},
  'all at one height': ({ y }) => y.fill(3.5),
  'on few heights': ({ y }) => y.set(y.map((value) => Math.floor(value / 200))),
  'one far outlier': ({ y }) => y.set([1e12], 5),
  'clustered in a wake': ({ y }, random) => y.set(y.map(() => 400 + 1e-6 * random() ** 8)),
  'on a pixel grid': ({ x, y, z }) => {
    for (const column of [x, y, z]) column.set(column.map((value) => Math.floor(value / 50)));
  },
  'both signs, tiny': ({ x, y }) => {
    for (const column of [x, y]) column.set(column.map((value) => (value - 400) * 1e-300));
  },
  'from end to end of the numbers': ({ y }, random) => y.set(y.map(() => (random() - 0.5) * 2 * Number.MAX_VALUE)),
  subnormal: ({ y }, random) => y.set(y.map(() => Math.floor(random() * 900) * 5e-324)),
};

describe.each(Object.keys(SHAPES))('canonical order of a frame %s', (shape) => {
  it.each([2, 3] as const)('is that of a plain sort, all columns together (%i-D)', (dims) => {
    const block = randomBlock(dims, [1, 700, 0, 2, 31, 1500], 21);
    SHAPES[shape]!(block, uniform(4));
    const after = sorted(block);
    for (let k = 0; k < block.number.length; k++) {
      const from = block.offsets[k]!;
      const rows = oracle(block, from, block.offsets[k + 1]!);
      const place = (i: number) => [block.x[i], block.y[i], dims === 3 ? block.z[i] : 0];
      const got = rows.map((_, i) => [after.x[from + i], after.y[from + i], dims === 3 ? after.z[from + i] : 0]);
      expect(got).toEqual(rows.map(place));
    }
    // Each row still carries its own values: `row` tells where it came from.
    for (const name of ['x', 'y', 'z', 'brightness', 'given'] as const) {
      const values = Array.from(after[name]);
      expect(values).toEqual(values.map((_, i) => block[name][after.row[i]!]));
    }
    expect([...after.row].sort((a, b) => a - b)).toEqual([...block.row]);
  });

  it('gives the same bits whatever the order of the rows', () => {
    for (const dims of [2, 3] as const) {
      const block = randomBlock(dims, [900, 40], 22);
      SHAPES[shape]!(block, uniform(5));
      const expected = columnsOf(sorted(block));
      for (let seed = 1; seed <= 5; seed++) expect(columnsOf(sorted(shuffled(block, seed)))).toEqual(expected);
    }
  });
});

describe('canonical order', () => {
  it('is y, then x, then z', () => {
    const after = sorted(blockOf([1, 2, 9], [2, 1, 0], [1, 2, 3], [0, 2, 5], [9, -1, 0]));
    expect([...after.row]).toEqual([4, 1, 3, 2, 0]);
  });

  it('keeps the order when positions are scaled by powers of two', () => {
    const block = randomBlock(3, [800], 23);
    const expected = [...sorted(block).row];
    for (const factor of [2 ** -40, 2 ** 40]) {
      const scaled = copyBlock(block);
      for (const column of [scaled.x, scaled.y, scaled.z]) column.set(column.map((v) => v * factor));
      expect([...sorted(scaled).row]).toEqual(expected);
    }
  });

  it('lets brightness and pathline decide between equal places, a missing brightness last', () => {
    const block = { ...blockOf([1, 1], [1, 1], [1, 1], [1, 1]) };
    const full: DetectionBlock = {
      ...block,
      brightness: Float32Array.of(Number.NaN, 7, 3, 3),
      given: Int32Array.of(1, 2, 9, 4),
    };
    expect([...sorted(full).row]).toEqual([3, 2, 1, 0]);
    for (let seed = 1; seed < 6; seed++) {
      expect([...sorted(shuffled(full, seed)).row]).toEqual([3, 2, 1, 0]);
    }
  });

  it('serves frames of growing and shrinking size with and without extra columns', () => {
    const sort = createFrameSorter();
    const plain = blockOf([2, 2], [1, 1]);
    sort(plain, 0, 2);
    expect([...plain.row]).toEqual([1, 0]);
    const large = randomBlock(3, [500], 3);
    sort(large, 0, 500);
    expect(columnsOf(large)).toEqual(columnsOf(sorted(randomBlock(3, [500], 3))));
    const small = randomBlock(2, [50], 4);
    sort(small, 0, 50);
    expect(columnsOf(small)).toEqual(columnsOf(sorted(randomBlock(2, [50], 4))));
  });
});
