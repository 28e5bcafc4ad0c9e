import type { DetectionBlock, Dims } from '../core/columns.js';
import { NearestFew } from '../math/nearest-few.js';

/** Neighbour whose distance is looked at: far enough for pairs of detections of one particle not to matter. */
const NEIGHBOUR = 6;
/** Median of a Gamma distribution of order 6 (k - 1/3 + 0.02 / k to three digits): what n times the area is then. */
const MEDIAN_COUNT = 5.67;
/** Frames are looked at until this many detections have been: whole frames, so that no choice of rows enters. */
const ENOUGH = 30_000;

/**
 * Mean spacing n^(-1/D) from the distance to the 6th neighbour within a frame: pi n d^2 (4/3 pi n d^3 in space) is
 * Gamma distributed for evenly seeded particles (Hertz 1909, Math. Ann. 67, 387). Unlike the area of a box it does not
 * depend on how the field lies to the axes, on bodies, or on a few strays. NaN where frames hold fewer than 12.
 */
export function spacingOfNeighbours(blocks: readonly DetectionBlock[], dims: Dims): number {
  const search = new NearestFew(NEIGHBOUR);
  const squares: number[] = [];
  for (const block of blocks) {
    for (let k = 0; k < block.number.length && squares.length < ENOUGH; k++) {
      const from = block.offsets[k];
      const rows = block.offsets[k + 1] - from;
      if (rows < 2 * NEIGHBOUR) continue;
      search.build(
        block,
        Uint32Array.from({ length: rows }, (_, i) => from + i),
        rows,
        dims,
      );
      for (let slot = 0; slot < rows; slot++) {
        const found = search.near(slot);
        if (found < NEIGHBOUR) continue;
        const other = search.slots[NEIGHBOUR * slot + NEIGHBOUR - 1];
        const dx = search.px[other] - search.px[slot];
        const dy = search.py[other] - search.py[slot];
        const dz = dims === 3 ? search.pz[other] - search.pz[slot] : 0;
        squares.push(dx * dx + dy * dy + dz * dz);
      }
    }
  }
  if (squares.length === 0) return Number.NaN;
  const distance = Math.sqrt(Float64Array.from(squares).sort()[squares.length >> 1]);
  const size = dims === 2 ? Math.PI * distance * distance : (4 / 3) * Math.PI * distance * distance * distance;
  const cell = size / MEDIAN_COUNT;
  return cell > 0 ? (dims === 2 ? Math.sqrt(cell) : Math.cbrt(cell)) : Number.NaN;
}
