import type { Dims } from '../core/columns.js';
import type { NeighbourSearch, PointColumns } from './neighbour-search.js';

/** Cells an axis may have beyond the square (cube) root of that many a point; keeps sparse or huge fields cheap. */
const CELLS_PER_POINT = 16;

/**
 * Cell index: points sorted by cell with a counting sort, cell edge = reach (or larger where the field is
 * sparse), one empty border cell all round so that a query never tests for borders. Build and query together
 * cost about 0.1 us a point in the plane. Buffers are kept between builds, so that one frame after the other
 * allocates nothing.
 */
export class CellIndex implements NeighbourSearch {
  private dims: Dims = 2;
  private start = new Uint32Array(1);
  private rows = new Int32Array(0);
  /** Copies of the coordinates in cell order: queries read memory in sequence. */
  private px = new Float64Array(0);
  private py = new Float64Array(0);
  private pz = new Float64Array(0);
  private cellOf = new Uint32Array(0);
  private minX = 0;
  private minY = 0;
  private minZ = 0;
  private perX = 1;
  private perY = 1;
  private perZ = 1;
  private countX = 3;
  private countY = 3;
  private countZ = 3;
  private scaleX = 1;
  private scaleY = 1;
  private scaleZ = 1;

  build(points: PointColumns, from: number, to: number, dims: Dims, reach: readonly [number, number, number]): void {
    const n = to - from;
    this.dims = dims;
    if (this.rows.length < n) this.grow(n);
    this.scaleX = 1 / reach[0];
    this.scaleY = 1 / reach[1];
    this.scaleZ = dims === 3 ? 1 / reach[2] : 0;
    const { x, y, z } = points;
    const [minX, maxX] = range(x, from, to);
    const [minY, maxY] = range(y, from, to);
    const [minZ, maxZ] = dims === 3 ? range(z, from, to) : [0, 0];
    this.minX = minX;
    this.minY = minY;
    this.minZ = minZ;
    const most = Math.max(4, Math.ceil((n * CELLS_PER_POINT) ** (1 / dims)));
    const cellsX = cellsAlong(maxX - minX, reach[0], most);
    const cellsY = cellsAlong(maxY - minY, reach[1], most);
    const cellsZ = dims === 3 ? cellsAlong(maxZ - minZ, reach[2], most) : { count: 1, per: 0 };
    this.perX = cellsX.per;
    this.perY = cellsY.per;
    this.perZ = cellsZ.per;
    this.countX = cellsX.count + 2;
    this.countY = cellsY.count + 2;
    this.countZ = dims === 3 ? cellsZ.count + 2 : 1;
    const cells = this.countX * this.countY * this.countZ;
    if (this.start.length < cells + 1) this.start = new Uint32Array(cells + 1);
    const start = this.start;
    start.fill(0, 0, cells + 1);
    const cellOf = this.cellOf;
    const { countX, countY, perX, perY, perZ } = this;
    for (let i = 0; i < n; i++) {
      const cx = 1 + Math.trunc((x[from + i] - minX) * perX);
      const cy = 1 + Math.trunc((y[from + i] - minY) * perY);
      const cz = dims === 3 ? 1 + Math.trunc((z[from + i] - minZ) * perZ) : 0;
      const cell = (cz * countY + cy) * countX + cx;
      cellOf[i] = cell;
      start[cell]++;
    }
    let sum = 0;
    for (let cell = 0; cell <= cells; cell++) {
      const count = cell < cells ? start[cell] : 0;
      start[cell] = sum;
      sum += count;
    }
    const { rows, px, py, pz } = this;
    for (let i = 0; i < n; i++) {
      const slot = start[cellOf[i]]++;
      rows[slot] = from + i;
      px[slot] = x[from + i];
      py[slot] = y[from + i];
      if (dims === 3) pz[slot] = z[from + i];
    }
    // The fill moved every start to the next cell's: move back by one cell.
    for (let cell = cells; cell > 0; cell--) start[cell] = start[cell - 1];
    start[0] = 0;
  }

  near(qx: number, qy: number, qz: number, into: Int32Array): number {
    const { start, rows, px, py, pz, countX, countY, countZ, scaleX, scaleY, scaleZ } = this;
    const cx = 1 + Math.floor((qx - this.minX) * this.perX);
    const cy = 1 + Math.floor((qy - this.minY) * this.perY);
    // A NaN place or one beyond the border cells has no neighbours: cells are at least one reach wide.
    if (!(cx >= 0 && cx < countX && cy >= 0 && cy < countY)) return 0;
    const x0 = cx > 0 ? cx - 1 : 0;
    const x1 = cx + 1 < countX ? cx + 1 : cx;
    const y0 = cy > 0 ? cy - 1 : 0;
    const y1 = cy + 1 < countY ? cy + 1 : cy;
    let found = 0;
    if (this.dims === 2) {
      for (let j = y0; j <= y1; j++) {
        const end = start[j * countX + x1 + 1];
        for (let slot = start[j * countX + x0]; slot < end; slot++) {
          const dx = (px[slot] - qx) * scaleX;
          const dy = (py[slot] - qy) * scaleY;
          if (dx * dx + dy * dy <= 1) into[found++] = rows[slot];
        }
      }
      return found;
    }
    const cz = 1 + Math.floor((qz - this.minZ) * this.perZ);
    if (!(cz >= 0 && cz < countZ)) return 0;
    const z0 = cz > 0 ? cz - 1 : 0;
    const z1 = cz + 1 < countZ ? cz + 1 : cz;
    for (let k = z0; k <= z1; k++) {
      for (let j = y0; j <= y1; j++) {
        const line = (k * countY + j) * countX;
        const end = start[line + x1 + 1];
        for (let slot = start[line + x0]; slot < end; slot++) {
          const dx = (px[slot] - qx) * scaleX;
          const dy = (py[slot] - qy) * scaleY;
          const dz = (pz[slot] - qz) * scaleZ;
          if (dx * dx + dy * dy + dz * dz <= 1) into[found++] = rows[slot];
        }
      }
    }
    return found;
  }

  private grow(n: number): void {
    const size = Math.ceil(n * 1.25) + 16;
    this.rows = new Int32Array(size);
    this.px = new Float64Array(size);
    this.py = new Float64Array(size);
    this.pz = new Float64Array(size);
    this.cellOf = new Uint32Array(size);
  }
}

function range(column: Float64Array, from: number, to: number): [number, number] {
  let min = Number.POSITIVE_INFINITY;
  let max = Number.NEGATIVE_INFINITY;
  for (let i = from; i < to; i++) {
    const value = column[i];
    if (value < min) min = value;
    if (value > max) max = value;
  }
  return from < to ? [min, max] : [0, 0];
}

/** How many cells of at least one reach cover `extent`, and cells per length. */
function cellsAlong(extent: number, reach: number, most: number): { count: number; per: number } {
  // A hair under 1 / reach keeps every cell at least one reach wide after rounding.
  const shrink = 1 - 1e-12;
  const wanted = extent / reach;
  if (!(wanted < most)) {
    const count = most;
    return { count: count + 1, per: (count / extent) * shrink };
  }
  return { count: Math.floor(wanted) + 1, per: shrink / reach };
}
