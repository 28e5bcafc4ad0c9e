import type { Dims } from '../core/columns.js';

/** Plain form of a flow grid: what a prior carries from the first look to the linker, also over a worker border. */
export interface FlowGridData {
  readonly dims: Dims;
  readonly count: readonly [number, number, number];
  /** Centre of cell (0, 0, 0), length unit. */
  readonly first: readonly [number, number, number];
  /** Cell edge, length unit. */
  readonly edge: number;
  /** Sums per cell, see `FlowGrid.moments`. */
  readonly moments: Float64Array;
}

/** Bounding box of the detections, length unit. */
export interface Box {
  readonly min: readonly [number, number, number];
  readonly max: readonly [number, number, number];
}

/** Sums a cell keeps in the plane and in space: 1, D, D (D + 1) / 2, D, D^2 of them. */
const MOMENTS = { 2: 12, 3: 22 } as const;
/** A fitted cell: weight, mean place, mean velocity, gradient by rows. */
const MODEL = { 2: 9, 3: 16 } as const;
/** Gradients are drawn to zero as if this many links, spread evenly over the cell, had shown none. */
const RIDGE = 1.5;
/** Weight of a velocity borrowed from neighbouring cells, in links. */
const BORROWED = 1e-3;

/**
 * Running picture of the flow as the linker knows it: on coarse cells a local linear fit (mean velocity at the
 * mean place, and the velocity gradient) of the velocities seen lately, blended between cell centres. Old frames
 * are forgotten step by step. Cells are centred on the box, so that mirrored and turned fields give mirrored and
 * turned pictures. What is learnt shows after the next `fit`.
 */
export class FlowGrid {
  readonly dims: Dims;
  readonly edge: number;
  readonly countX: number;
  readonly countY: number;
  readonly countZ: number;
  readonly firstX: number;
  readonly firstY: number;
  readonly firstZ: number;
  readonly cells: number;
  /**
   * Per cell, with positions relative to the cell centre: sum of weights; of positions; of products of positions
   * (xx xy yy, or xx xy xz yy yz zz); of velocities; of position times velocity (x u, y u, x v, ...).
   */
  private readonly moments: Float64Array;
  private readonly model: Float64Array;
  private readonly stride: number;
  private readonly modelStride: number;

  constructor(data: FlowGridData) {
    this.dims = data.dims;
    this.edge = data.edge;
    [this.countX, this.countY, this.countZ] = data.count;
    [this.firstX, this.firstY, this.firstZ] = data.first;
    this.cells = this.countX * this.countY * this.countZ;
    this.moments = data.moments;
    this.stride = MOMENTS[data.dims];
    this.modelStride = MODEL[data.dims];
    this.model = new Float64Array(this.cells * this.modelStride);
    this.fit();
    // The first time, knowledge spreads as far as it takes; later a ring of cells a frame is enough.
    while (this.spread() > 0);
  }

  /** A grid without any flow in it. `edge`: cell edge, length unit. */
  static empty(dims: Dims, box: Box, edge: number): FlowGrid {
    const count: [number, number, number] = [1, 1, 1];
    const first: [number, number, number] = [0, 0, 0];
    for (let axis = 0; axis < dims; axis++) {
      const extent = box.max[axis] - box.min[axis];
      count[axis] = Math.max(1, Math.ceil(extent / edge));
      const middle = 0.5 * (box.max[axis] + box.min[axis]);
      first[axis] = middle - 0.5 * (count[axis] - 1) * edge;
    }
    const cells = count[0] * count[1] * count[2];
    return new FlowGrid({ dims, count, first, edge, moments: new Float64Array(cells * MOMENTS[dims]) });
  }

  /** A copy in plain form; the grid goes on. */
  toData(): FlowGridData {
    return {
      dims: this.dims,
      count: [this.countX, this.countY, this.countZ],
      first: [this.firstX, this.firstY, this.firstZ],
      edge: this.edge,
      moments: this.moments.slice(),
    };
  }

  /** Cell that holds a place; places outside belong to the nearest cell. */
  cellAt(x: number, y: number, z: number): number {
    const i = nearest((x - this.firstX) / this.edge, this.countX);
    const j = nearest((y - this.firstY) / this.edge, this.countY);
    const k = this.dims === 3 ? nearest((z - this.firstZ) / this.edge, this.countZ) : 0;
    return (k * this.countY + j) * this.countX + i;
  }

  /** Centre of a cell into `into` [x, y, z]. */
  centre(cell: number, into: Float64Array): void {
    const i = cell % this.countX;
    const line = (cell - i) / this.countX;
    const j = line % this.countY;
    const k = (line - j) / this.countY;
    into[0] = this.firstX + i * this.edge;
    into[1] = this.firstY + j * this.edge;
    into[2] = this.firstZ + k * this.edge;
  }

  /** Weight behind a cell's fit, in links. */
  weightOf(cell: number): number {
    return this.model[cell * this.modelStride];
  }

  /** Forgets: multiplies all that is known by `keep`. */
  fade(keep: number): void {
    const { moments } = this;
    for (let n = 0; n < moments.length; n++) moments[n] *= keep;
  }

  /** The same flow with time turned round: all velocities change sign. */
  turnRound(): void {
    const { moments, model, stride, modelStride, dims } = this;
    const still = dims === 2 ? 6 : 10;
    const stillModel = 1 + dims;
    for (let cell = 0; cell < this.cells; cell++) {
      for (let n = still; n < stride; n++) moments[cell * stride + n] = -moments[cell * stride + n];
      for (let n = stillModel; n < modelStride; n++) model[cell * modelStride + n] = -model[cell * modelStride + n];
    }
  }

  /** Adds a velocity seen at a place to the cell that holds it. */
  learn(x: number, y: number, z: number, u: number, v: number, w: number): void {
    this.learnIn(this.cellAt(x, y, z), 1, x, y, z, u, v, w);
  }

  /** Adds a velocity with a weight to a given cell. */
  learnIn(cell: number, weight: number, x: number, y: number, z: number, u: number, v: number, w: number): void {
    const m = this.moments;
    let at = cell * this.stride;
    const i = cell % this.countX;
    const line = (cell - i) / this.countX;
    const j = line % this.countY;
    const dx = x - (this.firstX + i * this.edge);
    const dy = y - (this.firstY + j * this.edge);
    const wx = weight * dx;
    const wy = weight * dy;
    m[at] += weight;
    if (this.dims === 2) {
      m[at + 1] += wx;
      m[at + 2] += wy;
      m[at + 3] += wx * dx;
      m[at + 4] += wx * dy;
      m[at + 5] += wy * dy;
      m[at + 6] += weight * u;
      m[at + 7] += weight * v;
      m[at + 8] += wx * u;
      m[at + 9] += wy * u;
      m[at + 10] += wx * v;
      m[at + 11] += wy * v;
      return;
    }
    const k = (line - j) / this.countY;
    const dz = z - (this.firstZ + k * this.edge);
    const wz = weight * dz;
    const terms = [wx, wy, wz, wx * dx, wx * dy, wx * dz, wy * dy, wy * dz, wz * dz];
    for (const term of terms) m[++at] += term;
    for (const component of [u, v, w]) m[++at] += weight * component;
    for (const component of [u, v, w]) {
      m[++at] += wx * component;
      m[++at] += wy * component;
      m[++at] += wz * component;
    }
  }

  /**
   * Fits every cell anew from its sums; cells that have seen nothing borrow from their neighbours, one ring a call.
   * Cost: one small symmetric solve a cell.
   */
  fit(): void {
    let known = 0;
    for (let cell = 0; cell < this.cells; cell++) {
      if (this.moments[cell * this.stride] > 0) known++;
      if (this.dims === 2) this.fitPlane(cell);
      else this.fitSpace(cell);
    }
    if (known < this.cells) this.spread();
  }

  /**
   * Gives every cell without a velocity the mean of its neighbours that have one, with next to no weight: better
   * than rest for a particle that comes to a place nobody has been to. Returns how many cells were filled.
   */
  private spread(): number {
    const { countX, countY, countZ, model, modelStride, dims } = this;
    const velocity = 1 + dims;
    const filled: number[] = [];
    const values: number[] = [];
    for (let cell = 0; cell < this.cells; cell++) {
      if (model[cell * modelStride] > 0) continue;
      const i = cell % countX;
      const line = (cell - i) / countX;
      const j = line % countY;
      const k = (line - j) / countY;
      const sum = [0, 0, 0];
      let neighbours = 0;
      for (let c = Math.max(0, k - 1); c <= Math.min(countZ - 1, k + 1); c++) {
        for (let b = Math.max(0, j - 1); b <= Math.min(countY - 1, j + 1); b++) {
          for (let a = Math.max(0, i - 1); a <= Math.min(countX - 1, i + 1); a++) {
            const at = ((c * countY + b) * countX + a) * modelStride;
            if (!(model[at] > 0)) continue;
            neighbours++;
            for (let axis = 0; axis < dims; axis++) sum[axis] += model[at + velocity + axis];
          }
        }
      }
      if (neighbours === 0) continue;
      filled.push(cell);
      for (let axis = 0; axis < dims; axis++) values.push(sum[axis] / neighbours);
    }
    for (const [n, cell] of filled.entries()) {
      const at = cell * modelStride;
      model.fill(0, at, at + modelStride);
      model[at] = BORROWED;
      for (let axis = 0; axis < dims; axis++) model[at + velocity + axis] = values[n * dims + axis];
    }
    return filled.length;
  }

  private fitPlane(cell: number): void {
    const m = this.moments;
    const at = cell * this.stride;
    const to = cell * this.modelStride;
    const model = this.model;
    const weight = m[at];
    // A cell without links of its own keeps what it has borrowed.
    if (!(weight > 0)) return;
    model[to] = weight;
    const per = 1 / weight;
    const mx = m[at + 1] * per;
    const my = m[at + 2] * per;
    const mu = m[at + 6] * per;
    const mv = m[at + 7] * per;
    const ridge = (RIDGE * this.edge * this.edge) / 12;
    const sxx = m[at + 3] - weight * mx * mx + ridge;
    const sxy = m[at + 4] - weight * mx * my;
    const syy = m[at + 5] - weight * my * my + ridge;
    const xu = m[at + 8] - weight * mx * mu;
    const yu = m[at + 9] - weight * my * mu;
    const xv = m[at + 10] - weight * mx * mv;
    const yv = m[at + 11] - weight * my * mv;
    const perDeterminant = 1 / (sxx * syy - sxy * sxy);
    model[to + 1] = mx;
    model[to + 2] = my;
    model[to + 3] = mu;
    model[to + 4] = mv;
    model[to + 5] = (syy * xu - sxy * yu) * perDeterminant;
    model[to + 6] = (sxx * yu - sxy * xu) * perDeterminant;
    model[to + 7] = (syy * xv - sxy * yv) * perDeterminant;
    model[to + 8] = (sxx * yv - sxy * xv) * perDeterminant;
  }

  private fitSpace(cell: number): void {
    const m = this.moments;
    const at = cell * this.stride;
    const to = cell * this.modelStride;
    const model = this.model;
    const weight = m[at];
    // A cell without links of its own keeps what it has borrowed.
    if (!(weight > 0)) return;
    model[to] = weight;
    const per = 1 / weight;
    const mx = m[at + 1] * per;
    const my = m[at + 2] * per;
    const mz = m[at + 3] * per;
    const ridge = (RIDGE * this.edge * this.edge) / 12;
    const a = m[at + 4] - weight * mx * mx + ridge;
    const b = m[at + 5] - weight * mx * my;
    const c = m[at + 6] - weight * mx * mz;
    const d = m[at + 7] - weight * my * my + ridge;
    const e = m[at + 8] - weight * my * mz;
    const f = m[at + 9] - weight * mz * mz + ridge;
    // Inverse of the symmetric 3 x 3 matrix by cofactors.
    const ca = d * f - e * e;
    const cb = c * e - b * f;
    const cc = b * e - c * d;
    const cd = a * f - c * c;
    const ce = b * c - a * e;
    const cf = a * d - b * b;
    const perDeterminant = 1 / (a * ca + b * cb + c * cc);
    model[to + 1] = mx;
    model[to + 2] = my;
    model[to + 3] = mz;
    for (let axis = 0; axis < 3; axis++) {
      const mean = m[at + 10 + axis] * per;
      const px = m[at + 13 + 3 * axis] - weight * mx * mean;
      const py = m[at + 14 + 3 * axis] - weight * my * mean;
      const pz = m[at + 15 + 3 * axis] - weight * mz * mean;
      model[to + 4 + axis] = mean;
      model[to + 7 + 3 * axis] = (ca * px + cb * py + cc * pz) * perDeterminant;
      model[to + 8 + 3 * axis] = (cb * px + cd * py + ce * pz) * perDeterminant;
      model[to + 9 + 3 * axis] = (cc * px + ce * py + cf * pz) * perDeterminant;
    }
  }

  /**
   * Velocity at a place into `into` [u, v, w]; returns the weight behind it, 0 where nothing is known nearby
   * (then `into` holds zeros). The fits of the surrounding cells are blended multilinearly.
   */
  at(x: number, y: number, z: number, into: Float64Array): number {
    const { countX, countY, model, modelStride, edge } = this;
    const plane = this.dims === 2;
    const gx = clamp((x - this.firstX) / edge, countX);
    const gy = clamp((y - this.firstY) / edge, countY);
    const i = countX > 1 ? Math.min(Math.floor(gx), countX - 2) : 0;
    const j = countY > 1 ? Math.min(Math.floor(gy), countY - 2) : 0;
    const fx = gx - i;
    const fy = gy - j;
    let k = 0;
    let fz = 0;
    if (!plane) {
      const gz = clamp((z - this.firstZ) / edge, this.countZ);
      k = this.countZ > 1 ? Math.min(Math.floor(gz), this.countZ - 2) : 0;
      fz = gz - k;
    }
    let sum = 0;
    let known = 0;
    let su = 0;
    let sv = 0;
    let sw = 0;
    const layers = fz > 0 ? 2 : 1;
    const lines = fy > 0 ? 2 : 1;
    const columns = fx > 0 ? 2 : 1;
    for (let c = 0; c < layers; c++) {
      const partZ = c === 0 ? 1 - fz : fz;
      const dz0 = z - (this.firstZ + (k + c) * edge);
      for (let b = 0; b < lines; b++) {
        const partY = partZ * (b === 0 ? 1 - fy : fy);
        const dy0 = y - (this.firstY + (j + b) * edge);
        for (let a = 0; a < columns; a++) {
          const part = partY * (a === 0 ? 1 - fx : fx);
          const at = (((k + c) * countY + j + b) * countX + i + a) * modelStride;
          const weight = model[at];
          if (!(weight > 0) || part === 0) continue;
          // Cells with hardly any link count for less, so that one odd link does not steer its surroundings.
          const trust = (part * weight) / (weight + 1);
          const dx = x - (this.firstX + (i + a) * edge) - model[at + 1];
          const dy = dy0 - model[at + 2];
          sum += trust;
          known += part * weight;
          if (plane) {
            su += trust * (model[at + 3] + model[at + 5] * dx + model[at + 6] * dy);
            sv += trust * (model[at + 4] + model[at + 7] * dx + model[at + 8] * dy);
          } else {
            const dz = dz0 - model[at + 3];
            su += trust * (model[at + 4] + model[at + 7] * dx + model[at + 8] * dy + model[at + 9] * dz);
            sv += trust * (model[at + 5] + model[at + 10] * dx + model[at + 11] * dy + model[at + 12] * dz);
            sw += trust * (model[at + 6] + model[at + 13] * dx + model[at + 14] * dy + model[at + 15] * dz);
          }
        }
      }
    }
    const per = sum > 0 ? 1 / sum : 0;
    into[0] = su * per;
    into[1] = sv * per;
    into[2] = sw * per;
    return known;
  }
}

function nearest(position: number, count: number): number {
  const index = Math.floor(position + 0.5);
  return index < 0 ? 0 : index >= count ? count - 1 : index;
}

function clamp(position: number, count: number): number {
  return position < 0 ? 0 : Math.min(position, count - 1);
}
