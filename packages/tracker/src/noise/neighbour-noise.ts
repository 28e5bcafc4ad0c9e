import type { LinkedBlock } from '../core/columns.js';
import { LeastSquares } from '../math/least-squares.js';
import { medianInPlace, SIGMA_PER_MEDIAN } from '../math/median.js';
import { NearestFew } from '../math/nearest-few.js';
import type { NoiseEstimate } from './position-noise.js';

/** Neighbours that a quadratic surface is fitted to: 6 (in a volume 10) coefficients and some to spare. */
const NEIGHBOURS = { 2: 14, 3: 26 } as const;
const COEFFICIENTS = { 2: 6, 3: 10 } as const;

/** Fewest displacements for an estimate, and how many are looked at: the median is then good to about 2 %. */
const FEWEST = 30;
const ENOUGH = 4000;

/**
 * Position noise from the scatter of displacements among neighbours, for runs whose pathlines are too short for
 * differences along them (image pairs): a displacement less the value there of a quadratic surface fitted to the
 * displacements of its nearest neighbours in the same frame pair. For white noise its variance is
 * 2 sigma^2 (1 + q), q the variance factor of the fitted value; gradients and curvature of the flow drop out, so
 * that the estimate is too large only where the flow changes within a few mean spacings in a higher way.
 * Robust: 1.482602 times the median. NaN with fewer than 30 displacements. Cost: about 10 us a displacement, for
 * 4000 of them.
 */
export function neighbourNoise(blocks: readonly LinkedBlock[]): NoiseEstimate {
  const dims = blocks[0]?.dims ?? 2;
  const search = new NearestFew(NEIGHBOURS[dims]);
  const rows = blocks.reduce((sum, block) => sum + block.x.length, 0);
  const stride = Math.max(1, Math.floor(rows / 2 / ENOUGH));
  const residuals: [number[], number[], number[]] = [[], [], []];
  let before: { readonly block: LinkedBlock; readonly k: number } | null = null;
  for (const block of blocks) {
    for (let k = 0; k < block.number.length; k++) {
      const now = { block, k };
      if (before !== null && inSuccession(before, now)) gatherPair(before, now, search, stride, residuals);
      before = now;
    }
  }
  const samples = residuals[0].length;
  const factor = SIGMA_PER_MEDIAN / Math.SQRT2;
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

/** Adds the scaled residuals of every `stride`-th displacement from one frame to the next. */
function gatherPair(
  first: FramePlace,
  second: FramePlace,
  search: NearestFew,
  stride: number,
  residuals: [number[], number[], number[]],
): void {
  const a = first.block;
  const b = second.block;
  const { dims } = a;
  const rowOf = new Map<number, number>();
  for (let r = b.offsets[second.k]!; r < b.offsets[second.k + 1]!; r++) {
    if (b.pathline[r]! >= 0) rowOf.set(b.pathline[r]!, r);
  }
  const rows: number[] = [];
  const partner: number[] = [];
  for (let r = a.offsets[first.k]!; r < a.offsets[first.k + 1]!; r++) {
    const other = a.pathline[r]! >= 0 ? rowOf.get(a.pathline[r]!) : undefined;
    if (other === undefined) continue;
    rows.push(r);
    partner.push(other);
  }
  if (rows.length <= NEIGHBOURS[dims]) return;
  const from = [a.x, a.y, a.z].slice(0, dims);
  const to = [b.x, b.y, b.z].slice(0, dims);
  const moved = from.map((column, axis) => Float64Array.from(rows, (r, i) => to[axis]![partner[i]!]! - column[r]!));
  const places = {
    x: Float64Array.from(rows, (r) => a.x[r]!),
    y: Float64Array.from(rows, (r) => a.y[r]!),
    z: dims === 3 ? Float64Array.from(rows, (r) => a.z[r]!) : new Float64Array(0),
  };
  search.build(
    places,
    Uint32Array.from(rows, (_, i) => i),
    rows.length,
    dims,
  );
  for (let i = 0; i < rows.length; i += stride) {
    const own = search.slotOf[i]!;
    const found = search.near(own);
    const near = Array.from({ length: found }, (_, j) => search.rowOf[search.slots[search.k * own + j]!]!);
    const fit = surface(places, i, near, dims);
    if (fit === null) continue;
    for (let axis = 0; axis < dims; axis++) {
      const column = moved[axis]!;
      const at = fit.solve(Float64Array.from(near, (j) => column[j]!))[0]!;
      residuals[axis]!.push(Math.abs(column[i]! - at) / Math.sqrt(1 + fit.covarianceFactor()[0]!));
    }
  }
}

/** Quadratic surface about point `i`, whose value there is the first coefficient; null where the neighbours do not tell it. */
function surface(
  places: { readonly x: Float64Array; readonly y: Float64Array; readonly z: Float64Array },
  i: number,
  near: readonly number[],
  dims: 2 | 3,
): LeastSquares | null {
  const columns = COEFFICIENTS[dims];
  if (near.length < columns + 2) return null;
  const design = new Float64Array(near.length * columns);
  for (const [n, j] of near.entries()) {
    const x = places.x[j]! - places.x[i]!;
    const y = places.y[j]! - places.y[i]!;
    const z = dims === 3 ? places.z[j]! - places.z[i]! : 0;
    const terms = dims === 3 ? [1, x, y, z, x * x, x * y, x * z, y * y, y * z, z * z] : [1, x, y, x * x, x * y, y * y];
    design.set(terms, n * columns);
  }
  const fit = new LeastSquares(design, near.length, columns);
  return fit.rank === columns ? fit : null;
}
