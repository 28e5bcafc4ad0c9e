import type { Dims } from '../core/columns.js';
import { CellIndex } from '../math/cell-index.js';
import { cubeRoot } from '../math/cube-root.js';
import { sumAbout, TERMS } from './neighbour-sums.js';

/** Ridge of the linear and of the quadratic terms, against a neighbour's weight of one at the radius. */
const RIDGE_LINEAR = 0.001;
const RIDGE_QUADRATIC = 0.003;

/** Neighbours beyond which the radius is drawn in: three times what a field of even density has. */
const CROWD = 120;

const COLUMNS = ['x', 'y', 'z', 'u', 'v', 'w', 'trust'] as const;

/**
 * Flow of one frame interval as its links show it: at any place a local quadratic fit (moving least squares; Lancaster
 * & Salkauskas 1981, doi:10.1090/S0025-5718-1981-0616367-1) of the velocities of the links whose middles lie within a
 * radius, weights (1 - r^2)^2 times how sure each link is. It knows no cells, so a turned field gives a turned flow,
 * and no other frames, so it follows any unsteadiness. One object a thread; buffers are kept.
 */
export class NeighbourFlow {
  /** Links held. */
  count = 0;
  x = new Float64Array(0);
  y = new Float64Array(0);
  z = new Float64Array(0);
  u = new Float64Array(0);
  v = new Float64Array(0);
  w = new Float64Array(0);
  trust = new Float64Array(0);
  /** What `without` leaves out: a number for each link's pathline. */
  tag = new Int32Array(0);
  /** Of the last fit: sum of weights. */
  weight = 0;
  /** Of the last fit: variance of its value over that of one link's velocity, at most: weights count as inverse variances. */
  leverage = 0;
  /** Of the last fit: weighted sum of squared residuals, (length per time) squared, along z over depth noise. */
  residual = 0;
  private near = new Int32Array(0);
  private stale = true;
  private source: NeighbourFlow | null = null;
  private readonly index = new CellIndex();
  private readonly dims: Dims;
  private readonly radius: number;
  private readonly depth: number;
  private readonly matrix: Float64Array;
  private readonly right: Float64Array;
  private readonly slope = new Float64Array(9);
  private readonly place = new Float64Array(3);

  /** `radius`: length unit, in plane; along z it is that times `depthNoise`. */
  constructor(dims: Dims, radius: number, depthNoise: number) {
    this.dims = dims;
    this.radius = radius;
    this.depth = dims === 3 ? 1 / depthNoise : 1;
    this.matrix = new Float64Array(TERMS[dims] * TERMS[dims]);
    this.right = new Float64Array(TERMS[dims] * 4);
  }

  /** Forgets all links; room for `most`. */
  begin(most: number): void {
    this.count = 0;
    this.stale = true;
    this.source = null;
    if (this.tag.length >= most) return;
    const size = Math.ceil(most * 1.3) + 16;
    for (const name of COLUMNS) this[name] = new Float64Array(size);
    this.tag = new Int32Array(size);
    this.near = new Int32Array(size);
  }

  /** Adds a link: its pathline, middle, velocity and how sure it is (0 to 1). */
  add(tag: number, x: number, y: number, z: number, u: number, v: number, w: number, trust: number): void {
    const n = this.count++;
    this.tag[n] = tag;
    this.x[n] = x;
    this.y[n] = y;
    this.z[n] = z;
    this.u[n] = u;
    this.v[n] = v;
    this.w[n] = w;
    this.trust[n] = trust;
  }

  /** Gives every link the tag that `of` holds at its present one. */
  retag(of: Int32Array): void {
    for (let n = 0; n < this.count; n++) this.tag[n] = of[this.tag[n]];
  }

  /** The same flow with time turned round. */
  turnRound(): void {
    for (const column of [this.u, this.v, this.w]) for (let n = 0; n < this.count; n++) column[n] = -column[n];
    this.tag.fill(-1, 0, this.count);
  }

  /** Copies of the links, a column each. */
  toData(): Float64Array[] {
    return COLUMNS.map((name) => this[name].slice(0, this.count));
  }

  /** Takes links from `toData`, of no pathline. */
  restore(columns: readonly Float64Array[]): void {
    const links = columns[0].length;
    this.begin(links);
    for (const [n, name] of COLUMNS.entries()) this[name].set(columns[n]);
    this.tag.fill(-1, 0, links);
    this.count = links;
  }

  /** Holds the links of another from now on; they are only copied once they are asked for. */
  follow(other: NeighbourFlow): void {
    this.count = other.count;
    this.stale = true;
    this.source = other;
  }

  private copy(other: NeighbourFlow): void {
    this.begin(other.count);
    for (const name of COLUMNS) this[name].set(other[name].subarray(0, other.count));
    this.tag.set(other.tag.subarray(0, other.count));
    this.count = other.count;
  }

  /**
   * Mean velocity over a step that starts at (x, y, z), into `into` [u, v, w]: the fit is made about (mx, my, mz), the
   * supposed middle of the step, and read at the middle that its own value leads to. Returns the weight of the
   * neighbours, 0: there are none. The link tagged `without` is left out.
   */
  along(
    x: number,
    y: number,
    z: number,
    step: number,
    mx: number,
    my: number,
    mz: number,
    without: number,
    into: Float64Array,
  ): number {
    if (!this.fitAbout(mx, my, mz, without, into)) return 0;
    const { slope } = this;
    const u = into[0];
    const v = into[1];
    const w = into[2];
    const half = 0.5 * step;
    for (let turn = 0; turn < 3; turn++) {
      const dx = x + half * into[0] - mx;
      const dy = y + half * into[1] - my;
      const dz = z + half * into[2] - mz;
      into[0] = u + slope[0] * dx + slope[1] * dy + slope[2] * dz;
      into[1] = v + slope[3] * dx + slope[4] * dy + slope[5] * dz;
      into[2] = w + slope[6] * dx + slope[7] * dy + slope[8] * dz;
    }
    return this.weight;
  }

  /** Fits about a place: value into `into`, gradient into `slope`, and the figures of the fit. */
  private fitAbout(px: number, py: number, pz: number, without: number, into: Float64Array): boolean {
    if (this.count === 0) return false;
    if (this.stale) this.build();
    const { near, radius, depth, dims, matrix, right, slope, place } = this;
    const found = this.index.near(px, py, pz, near);
    if (found === 0) return false;
    // Where particles crowd, fewer neighbours about the place tell as much, at a cost that does not grow.
    const crowding = found / CROWD;
    const per = (crowding > 1 ? (dims === 2 ? Math.sqrt(crowding) : cubeRoot(crowding)) : 1) / radius;
    const perZ = per * depth;
    place[0] = px;
    place[1] = py;
    place[2] = pz;
    let left = sumAbout(dims, this, near, found, place, per, perZ, without, matrix, right);
    const weight = matrix[0];
    if (!(weight > 0)) return false;
    const terms = TERMS[dims];
    const linear = 1 + dims;
    for (let m = 1; m < terms; m++) matrix[m * terms + m] += m < linear ? RIDGE_LINEAR : RIDGE_QUADRATIC;
    // Elimination from the last term to the first, so that the value is solved first and gradients follow.
    for (let k = terms - 1; k > 0; k--) {
      const pivot = 1 / matrix[k * terms + k];
      const ru = right[4 * k];
      const rv = right[4 * k + 1];
      const rw = right[4 * k + 2];
      left -= pivot * (ru * ru + rv * rv + rw * depth * (rw * depth));
      for (let m = 0; m < k; m++) {
        const factor = matrix[m * terms + k] * pivot;
        for (let n = m; n < k; n++) matrix[m * terms + n] -= factor * matrix[n * terms + k];
        right[4 * m] -= factor * ru;
        right[4 * m + 1] -= factor * rv;
        right[4 * m + 2] -= factor * rw;
      }
    }
    const pivot = 1 / matrix[0];
    for (let axis = 0; axis < dims; axis++) {
      const value = right[axis] * pivot;
      into[axis] = value;
      for (let m = 1; m < linear; m++) {
        let rest = right[4 * m + axis] - matrix[m] * value;
        for (let k = 1; k < m; k++) rest -= matrix[k * terms + m] * slope[3 * axis + k - 1];
        slope[3 * axis + m - 1] = rest / matrix[m * terms + m];
      }
      const scaled = value * right[axis] * (axis === 2 ? depth * depth : 1);
      left -= scaled;
    }
    for (let axis = 0; axis < dims; axis++) {
      slope[3 * axis] *= per;
      slope[3 * axis + 1] *= per;
      slope[3 * axis + 2] *= perZ;
    }
    if (dims === 2) into[2] = 0;
    this.weight = weight;
    this.leverage = pivot;
    this.residual = Math.max(left, 0);
    return true;
  }

  private build(): void {
    const { radius, depth, dims } = this;
    if (this.source !== null) this.copy(this.source);
    this.stale = false;
    this.index.build(this, 0, this.count, dims, [radius, radius, dims === 3 ? radius / depth : radius]);
  }
}
