import type { LinkedBlock } from '../core/columns.js';
import { medianInPlace, SIGMA_PER_MEDIAN } from '../math/median.js';
import { NearestFew } from '../math/nearest-few.js';
import type { NoiseEstimate } from './position-noise.js';

/** Neighbours whose mean displacement each one is held against. */
const NEIGHBOURS = 6;

/** Fewest displacements for an estimate. */
const FEWEST = 30;

/**
 * Position noise from the scatter of displacements among neighbours, for runs whose pathlines are too short for
 * differences along them (image pairs): displacement less the mean of the 6 nearest of the same frame pair has
 * variance 2 sigma^2 (1 + 1/6) for white noise, where the flow changes little over their distance; where it does not
 * the estimate is too large. Robust: 1.482602 times the median. NaN with fewer than 30 displacements.
 */
export function neighbourNoise(blocks: readonly LinkedBlock[]): NoiseEstimate {
  const search = new NearestFew(NEIGHBOURS);
  const residuals: [number[], number[], number[]] = [[], [], []];
  let before: { readonly block: LinkedBlock; readonly k: number } | null = null;
  for (const block of blocks) {
    for (let k = 0; k < block.number.length; k++) {
      const now = { block, k };
      if (before !== null && inSuccession(before, now)) gatherPair(before, now, search, residuals);
      before = now;
    }
  }
  const samples = residuals[0].length;
  const factor = SIGMA_PER_MEDIAN / Math.sqrt(2 * (1 + 1 / NEIGHBOURS));
  const sigmaOf = (values: number[]): number =>
    values.length < FEWEST ? Number.NaN : factor * medianInPlace(Float64Array.from(values), values.length);
  return {
    sigma: [sigmaOf(residuals[0]), sigmaOf(residuals[1]), sigmaOf(residuals[2])],
    samples,
    method: 'neighbours',
  };
}

interface FramePlace {
  readonly block: LinkedBlock;
  readonly k: number;
}

function inSuccession(a: FramePlace, b: FramePlace): boolean {
  return a.block.segment[a.k] === b.block.segment[b.k] && b.block.number[b.k]! - a.block.number[a.k]! === 1;
}

function gatherPair(
  first: FramePlace,
  second: FramePlace,
  search: NearestFew,
  residuals: [number[], number[], number[]],
): void {
  const a = first.block;
  const b = second.block;
  const rowOf = new Map<number, number>();
  for (let r = b.offsets[second.k]!; r < b.offsets[second.k + 1]!; r++) {
    if (b.pathline[r]! >= 0) rowOf.set(b.pathline[r]!, r);
  }
  const rows: number[] = [];
  const partner = new Map<number, number>();
  for (let r = a.offsets[first.k]!; r < a.offsets[first.k + 1]!; r++) {
    const other = a.pathline[r]! >= 0 ? rowOf.get(a.pathline[r]!) : undefined;
    if (other === undefined) continue;
    rows.push(r);
    partner.set(r, other);
  }
  if (rows.length <= NEIGHBOURS) return;
  search.build(a, Uint32Array.from(rows), rows.length, a.dims);
  const columns: [Float64Array, Float64Array][] = [
    [a.x, b.x],
    [a.y, b.y],
  ];
  if (a.dims === 3) columns.push([a.z, b.z]);
  for (let i = 0; i < rows.length; i++) {
    const found = search.near(search.slotOf[i]!);
    for (const [axis, [from, to]] of columns.entries()) {
      let sum = 0;
      for (let j = 0; j < found; j++) {
        const r = search.rowOf[search.slots[j]!]!;
        sum += to[partner.get(r)!]! - from[r]!;
      }
      const own = to[partner.get(rows[i]!)!]! - from[rows[i]!]!;
      residuals[axis]!.push(Math.abs(own - sum / found));
    }
  }
}
