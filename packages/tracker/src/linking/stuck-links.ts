import type { DetectionBlock, Dims } from '../core/columns.js';
import { CellIndex } from '../math/cell-index.js';
import type { LinkTally } from './linker.js';
import type { StuckPlace } from './stuck-places.js';

/**
 * Links the detections at stuck places, frame after frame, each place to pathlines of its own. The others are for the
 * linker, whose numbers are shifted so that all pathlines together stay numbered by first frame. Memory: one entry a
 * place, and 8 bytes for each pathline begun at one.
 */
export class StuckLinks {
  /** Provisional numbers of all pathlines at stuck places so far. */
  readonly pathlines = new Set<number>();
  readonly tally: LinkTally = { links: 0, bridging: 0, leftOutForRisk: 0, pathlines: 0 };
  private readonly places: readonly StuckPlace[];
  private readonly dims: Dims;
  private readonly bridge: number;
  private readonly search = new CellIndex();
  private readonly near: Int32Array;
  private readonly nearestRow: Int32Array;
  private readonly nearestSquare: Float64Array;
  /** Pathline that stands at a place, and where it was seen last. */
  private readonly current: Int32Array;
  private readonly lastNumber: Int32Array;
  private readonly lastSegment: Int32Array;
  /** How many pathlines the linker had begun when each of ours began; ascending. */
  private readonly begunBefore: number[] = [];

  constructor(places: readonly StuckPlace[], dims: Dims, bridge: number) {
    this.places = places;
    this.dims = dims;
    this.bridge = bridge;
    const n = places.length;
    this.near = new Int32Array(n);
    this.nearestRow = new Int32Array(n);
    this.nearestSquare = new Float64Array(n);
    this.current = new Int32Array(n).fill(-1);
    this.lastNumber = new Int32Array(n);
    this.lastSegment = new Int32Array(n);
    const column = (axis: number) => Float64Array.from(places, ({ at }) => at[axis]);
    const reach = [0, 1, 2].map((axis) => 2 * Math.max(...places.map(({ radius }) => radius[axis])));
    const points = { x: column(0), y: column(1), z: column(2) };
    this.search.build(points, 0, n, dims, [reach[0], reach[1], Math.max(reach[2], reach[0])]);
  }

  /** Place of each row of a block, -1 for those of the flow: in every frame the nearest detection within a place's radius. */
  take(block: DetectionBlock): Int32Array {
    const { places, search, near, nearestRow, nearestSquare, dims } = this;
    const placeOf = new Int32Array(block.x.length).fill(-1);
    for (let k = 0; k < block.number.length; k++) {
      nearestSquare.fill(Number.POSITIVE_INFINITY);
      nearestRow.fill(-1);
      for (let row = block.offsets[k]; row < block.offsets[k + 1]; row++) {
        const found = search.near(block.x[row], block.y[row], dims === 3 ? block.z[row] : 0, near);
        for (let n = 0; n < found; n++) {
          const { at, radius } = places[near[n]];
          const dx = (block.x[row] - at[0]) / radius[0];
          const dy = (block.y[row] - at[1]) / radius[1];
          const dz = dims === 3 ? (block.z[row] - at[2]) / radius[2] : 0;
          if (!(dx * dx <= 1 && dy * dy <= 1 && dz * dz <= 1)) continue;
          const square = dx * dx + dy * dy + dz * dz;
          if (square >= nearestSquare[near[n]]) continue;
          nearestSquare[near[n]] = square;
          nearestRow[near[n]] = row;
        }
      }
      for (let p = 0; p < places.length; p++) if (nearestRow[p] >= 0) placeOf[nearestRow[p]] = p;
    }
    return placeOf;
  }

  /**
   * Writes pathlines into the rows of frame `k` that `take` gave a place. `begun`: pathlines that the linker had begun
   * before this frame. To be called for all frames in order.
   */
  frame(block: DetectionBlock, k: number, placeOf: Int32Array, begun: number, pathline: Int32Array): void {
    const { current, lastNumber, lastSegment, begunBefore, tally } = this;
    for (let row = block.offsets[k]; row < block.offsets[k + 1]; row++) {
      const p = placeOf[row];
      if (p < 0) continue;
      const missed = block.number[k] - lastNumber[p] - 1;
      if (current[p] < 0 || lastSegment[p] !== block.segment[k] || missed > this.bridge) {
        current[p] = begun + begunBefore.length;
        begunBefore.push(begun);
        this.pathlines.add(current[p]);
        tally.pathlines++;
      } else {
        tally.links++;
        if (missed > 0) tally.bridging++;
      }
      lastNumber[p] = block.number[k];
      lastSegment[p] = block.segment[k];
      pathline[row] = current[p];
    }
  }

  /** The number of the linker's pathline `id` among all. */
  shifted(id: number): number {
    const { begunBefore } = this;
    let low = 0;
    let high = begunBefore.length;
    while (low < high) {
      const middle = (low + high) >>> 1;
      if (begunBefore[middle] <= id) low = middle + 1;
      else high = middle;
    }
    return id + low;
  }
}

/** The rows of a block that have no place, as a block of its own, and which they are. New columns. */
export function withoutPlaces(
  block: DetectionBlock,
  placeOf: Int32Array,
): { readonly block: DetectionBlock; readonly rows: Int32Array } {
  let count = 0;
  for (const place of placeOf) if (place < 0) count++;
  const rows = new Int32Array(count);
  const offsets = new Uint32Array(block.offsets.length);
  let to = 0;
  for (let k = 0; k < block.number.length; k++) {
    for (let row = block.offsets[k]; row < block.offsets[k + 1]; row++) if (placeOf[row] < 0) rows[to++] = row;
    offsets[k + 1] = to;
  }
  const doubles = (column: Float64Array) =>
    column.length === 0 ? new Float64Array(0) : Float64Array.from(rows, (row) => column[row]);
  return {
    rows,
    block: {
      ...block,
      offsets,
      x: doubles(block.x),
      y: doubles(block.y),
      z: doubles(block.z),
      row: doubles(block.row),
      brightness:
        block.brightness.length === 0 ? block.brightness : Float32Array.from(rows, (row) => block.brightness[row]),
      given: block.given.length === 0 ? block.given : Int32Array.from(rows, (row) => block.given[row]),
    },
  };
}
