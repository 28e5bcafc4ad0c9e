import type { DetectionBlock } from '../core/columns.js';

/** Place that no particle of this field can have: per axis, limits in result units. */
export interface FieldLimits {
  readonly min: readonly [number, number, number];
  readonly max: readonly [number, number, number];
}

/**
 * How many interquartile ranges beyond the quartiles a detection may lie. An evenly seeded field is two interquartile
 * ranges wide, so this is ten fields away: a position there is a slip of a digit, no particle, and would stretch every
 * grid that the field is laid on.
 */
const FAR = 20;
/** Positions that the quartiles are taken from. */
const ENOUGH = 50_000;

/** Limits of the field from its quartiles; infinite along an axis whose quartiles are one. Cost: a sort of 50 000 values an axis. */
export function fieldLimits(blocks: readonly DetectionBlock[]): FieldLimits {
  const min: [number, number, number] = [0, 0, 0];
  const max: [number, number, number] = [0, 0, 0];
  const rows = blocks.reduce((sum, block) => sum + block.x.length, 0);
  const stride = Math.max(1, Math.floor(rows / ENOUGH));
  for (const [axis, name] of (['x', 'y', 'z'] as const).entries()) {
    const values: number[] = [];
    for (const block of blocks) for (let i = 0; i < block[name].length; i += stride) values.push(block[name][i]);
    const sorted = Float64Array.from(values).sort();
    const low = sorted[Math.floor(sorted.length / 4)];
    const high = sorted[Math.floor((3 * sorted.length) / 4)];
    const room = high > low ? FAR * (high - low) : Number.POSITIVE_INFINITY;
    min[axis] = values.length > 0 ? low - room : Number.NEGATIVE_INFINITY;
    max[axis] = values.length > 0 ? high + room : Number.POSITIVE_INFINITY;
  }
  return { min, max };
}

/** Detections left out because they lie far from the field, and the first few of them. */
export interface FarAwayTally {
  farAway: number;
  /** At most five: data row of the dump and position. */
  readonly examples: { readonly row: number; readonly x: number; readonly y: number }[];
}

/** A tally of nothing. */
export function newFarAwayTally(): FarAwayTally {
  return { farAway: 0, examples: [] };
}

/**
 * The block without detections beyond the limits. Where there are any, the columns it gives are shorter views of the
 * same buffers and `offsets` is changed; else the block itself.
 */
export function dropFarAway(block: DetectionBlock, limits: FieldLimits, tally: FarAwayTally): DetectionBlock {
  const { x, y, z, brightness, row, given, offsets, dims } = block;
  const { min, max } = limits;
  const far = (i: number) =>
    x[i] < min[0] ||
    x[i] > max[0] ||
    y[i] < min[1] ||
    y[i] > max[1] ||
    (dims === 3 && (z[i] < min[2] || z[i] > max[2]));
  let any = false;
  for (let i = 0; i < x.length && !any; i++) any = far(i);
  if (!any) return block;
  const columns = [x, y, z, brightness, row, given].filter((column) => column.length > 0);
  let to = 0;
  let from = 0;
  for (let k = 0; k + 1 < offsets.length; k++) {
    const end = offsets[k + 1];
    for (; from < end; from++) {
      if (far(from)) {
        tally.farAway++;
        if (tally.examples.length < 5) tally.examples.push({ row: row[from], x: x[from], y: y[from] });
        continue;
      }
      if (to !== from) for (const column of columns) column[to] = column[from];
      to++;
    }
    offsets[k + 1] = to;
  }
  const cut = <T extends Float64Array | Float32Array | Int32Array>(column: T): T =>
    (column.length > 0 ? column.subarray(0, to) : column) as T;
  return {
    ...block,
    x: cut(x),
    y: cut(y),
    z: cut(z),
    brightness: cut(brightness),
    row: cut(row),
    given: cut(given),
  };
}
