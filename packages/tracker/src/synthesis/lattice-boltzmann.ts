import { CX, CY, equilibriumInto, OPPOSITE } from './lattice-directions.js';
import { findWallLinks, type WallLinks } from './wall-links.js';

/** What a lattice is made of. Lattice units: cell edge 1, time step 1, density 1. */
export interface LatticeOptions {
  /** Cells along x and y, the outermost ring included. Cell (i, j) has its centre at (i, j). */
  readonly width: number;
  readonly height: number;
  /** Kinematic viscosity, lattice units. */
  readonly viscosity: number;
  /**
   * Distance to the wall, positive in the fluid, its zero line being the wall; smooth near it. Absent: no wall.
   * Cells where it is not positive are solid.
   */
  readonly wall?: (x: number, y: number) => number;
  /**
   * What the ring of outermost cells does: `periodic`, or `open`: velocity imposed by `edge` on the left, lower and
   * upper side, constant pressure on the right.
   */
  readonly border: 'periodic' | 'open';
  /** Imposed velocity on the open sides. */
  readonly edge?: (x: number, y: number) => readonly [number, number];
  /** Columns before the right side over which viscosity rises tenfold, to damp what leaves. Default 0. */
  readonly sponge?: number;
}

/**
 * (tau+ - 1/2)(tau- - 1/2) = 1/12 cancels the leading error of advection (I. Ginzburg, F. Verhaeghe & D. d'Humieres,
 * Commun. Comput. Phys. 3 (2008) 427-478). With 1/4 the odd moments relax so slowly at small viscosity that the open
 * sides grew unstable (tried at tau+ = 0.52).
 */
const MAGIC = 1 / 12;
/** Viscosity at the end of the sponge over that of the fluid: enough to damp vortices within two diameters (tried). */
const SPONGE_RISE = 10;

/**
 * Plane flow on a square lattice with nine velocities (Y. H. Qian, D. d'Humieres & P. Lallemand, Europhys. Lett. 17
 * (1992) 479-484), two relaxation times (Ginzburg et al. 2008), the equilibrium for nearly incompressible flow (X. He
 * & L.-S. Luo, J. Stat. Phys. 88 (1997) 927-944), walls anywhere between cells by linearly interpolated bounce-back
 * (M. Bouzidi, M. Firdaouss & P. Lallemand, Phys. Fluids 13 (2001) 3452-3459), and force by
 * momentum exchange.
 * Second-order accurate in the cell size, error of order speed^2 from compressibility (speed against 0.577).
 * Populations are kept less their rest weights in Float32: 72 bytes a cell. One step costs about 50 ns a cell.
 */
export class Lattice {
  readonly width: number;
  readonly height: number;
  /** Force of the fluid on the wall in the last step, lattice units. */
  forceX = 0;
  forceY = 0;

  private readonly options: LatticeOptions;
  /** Populations after collision, one plane a direction. */
  private now: Float32Array[];
  private next: Float32Array[];
  /** Relaxation rates by column. */
  private readonly plus: Float64Array;
  private readonly minus: Float64Array;
  /** First and end index of each run of fluid cells within the ring. */
  private readonly runs: Int32Array;
  private readonly links: WallLinks;
  private readonly edgeVelocity: Float64Array;
  private readonly eq = new Float64Array(9);
  private readonly near = new Float64Array(3);

  constructor(options: LatticeOptions) {
    this.options = options;
    this.width = options.width;
    this.height = options.height;
    const cells = this.width * this.height;
    this.now = Array.from({ length: 9 }, () => new Float32Array(cells));
    this.next = Array.from({ length: 9 }, () => new Float32Array(cells));
    this.plus = new Float64Array(this.width);
    this.minus = new Float64Array(this.width);
    const sponge = options.sponge ?? 0;
    for (let i = 0; i < this.width; i++) {
      const into = sponge === 0 ? 0 : Math.max(0, (i - (this.width - 1 - sponge)) / sponge);
      const half = 3 * options.viscosity * (1 + (SPONGE_RISE - 1) * into * into);
      this.plus[i] = 1 / (half + 0.5);
      this.minus[i] = 1 / (MAGIC / half + 0.5);
    }
    this.runs = this.findRuns();
    this.links = findWallLinks(options);
    this.edgeVelocity = new Float64Array(2 * cells * (options.edge === undefined ? 0 : 1));
    if (options.edge !== undefined) {
      this.overRing((i, j) => {
        const at = j * this.width + i;
        [this.edgeVelocity[2 * at], this.edgeVelocity[2 * at + 1]] = options.edge!(i, j);
      });
    }
  }

  /** Sets every cell to equilibrium at the given velocity and density less 1. */
  initialise(field: (x: number, y: number) => readonly [number, number, number]): void {
    for (let j = 0; j < this.height; j++) {
      for (let i = 0; i < this.width; i++) {
        const [u, v, density] = field(i, j);
        equilibriumInto(density, u, v, this.eq);
        for (let d = 0; d < 9; d++) this.now[d][j * this.width + i] = this.eq[d];
      }
    }
  }

  /** Advances by one time step. */
  step(): void {
    if (this.options.border === 'periodic') this.wrapRing();
    else this.openRing();
    this.bounce();
    this.streamAndCollide();
    [this.now, this.next] = [this.next, this.now];
  }

  /** Velocity and density less 1 of one cell, written to `into[0..2]`. */
  momentsInto(i: number, j: number, into: Float64Array): void {
    this.moments(j * this.width + i, into);
  }

  private moments(at: number, into: Float64Array): void {
    let density = 0;
    let u = 0;
    let v = 0;
    for (let d = 0; d < 9; d++) {
      const f = this.now[d][at];
      density += f;
      u += CX[d] * f;
      v += CY[d] * f;
    }
    into[0] = u;
    into[1] = v;
    into[2] = density;
  }

  private solid(i: number, j: number): boolean {
    return this.options.wall !== undefined && !(this.options.wall(i, j) > 0);
  }

  private findRuns(): Int32Array {
    const runs: number[] = [];
    for (let j = 1; j < this.height - 1; j++) {
      let open = -1;
      for (let i = 1; i <= this.width - 1; i++) {
        const fluid = i < this.width - 1 && !this.solid(i, j);
        if (fluid && open < 0) open = i;
        if (!fluid && open >= 0) {
          runs.push(j * this.width, open, i);
          open = -1;
        }
      }
    }
    return Int32Array.from(runs);
  }

  /**
   * What comes back from the wall is laid into the solid cell at the far end of the link, in the direction in which
   * the fluid cell will pull it: each such place belongs to one link only.
   */
  private bounce(): void {
    const { fluid, direction, share } = this.links;
    let forceX = 0;
    let forceY = 0;
    for (let k = 0; k < fluid.length; k++) {
      const at = fluid[k];
      const d = direction[k];
      const back = OPPOSITE[d];
      const q = share[k];
      const jump = CY[d] * this.width + CX[d];
      const out = this.now[d][at];
      const returned =
        q < 0.5
          ? 2 * q * out + (1 - 2 * q) * this.now[d][at - jump]
          : out / (2 * q) + ((2 * q - 1) / (2 * q)) * this.now[back][at];
      this.now[back][at + jump] = returned;
      forceX += CX[d] * (out + returned);
      forceY += CY[d] * (out + returned);
    }
    this.forceX = forceX;
    this.forceY = forceY;
  }

  private overRing(visit: (i: number, j: number, nearI: number, nearJ: number) => void): void {
    const right = this.width - 1;
    const top = this.height - 1;
    const near = (value: number, last: number) => Math.min(Math.max(value, 1), last - 1);
    for (let i = 0; i <= right; i++) {
      visit(i, 0, near(i, right), 1);
      visit(i, top, near(i, right), top - 1);
    }
    for (let j = 1; j < top; j++) {
      visit(0, j, 1, j);
      visit(right, j, right - 1, j);
    }
  }

  private wrapRing(): void {
    const wrap = (value: number, last: number) => (value === 0 ? last - 1 : value === last ? 1 : value);
    this.overRing((i, j) => {
      const from = wrap(j, this.height - 1) * this.width + wrap(i, this.width - 1);
      for (let d = 0; d < 9; d++) this.now[d][j * this.width + i] = this.now[d][from];
    });
  }

  /**
   * Equilibrium at the imposed velocity and the neighbour's density, or at density 1 and the neighbour's velocity.
   * The stress left out is of the order of viscosity times the velocity gradient, next to nothing where the sides
   * should lie.
   */
  private openRing(): void {
    const near = this.near;
    this.overRing((i, j, nearI, nearJ) => {
      const at = j * this.width + i;
      this.moments(nearJ * this.width + nearI, near);
      if (i === this.width - 1) equilibriumInto(0, near[0], near[1], this.eq);
      else equilibriumInto(near[2], this.edgeVelocity[2 * at], this.edgeVelocity[2 * at + 1], this.eq);
      for (let d = 0; d < 9; d++) this.now[d][at] = this.eq[d];
    });
  }

  private streamAndCollide(): void {
    const [s0, s1, s2, s3, s4, s5, s6, s7, s8] = this.now;
    const [t0, t1, t2, t3, t4, t5, t6, t7, t8] = this.next;
    const { width, runs, plus, minus } = this;
    for (let r = 0; r < runs.length; r += 3) {
      const row = runs[r];
      const end = runs[r + 2];
      for (let i = runs[r + 1]; i < end; i++) {
        const at = row + i;
        const f0 = s0[at];
        const f1 = s1[at - 1];
        const f2 = s2[at + 1];
        const f3 = s3[at - width];
        const f4 = s4[at + width];
        const f5 = s5[at - 1 - width];
        const f6 = s6[at + 1 + width];
        const f7 = s7[at + 1 - width];
        const f8 = s8[at - 1 + width];
        const u = f1 - f2 + f5 - f6 - f7 + f8;
        const v = f3 - f4 + f5 - f6 + f7 - f8;
        const density = f0 + f1 + f2 + f3 + f4 + f5 + f6 + f7 + f8;
        const even = density - 1.5 * (u * u + v * v);
        const a = plus[i];
        const b = minus[i];
        // Even and odd halves of each opposite pair relax towards w (density + 4.5 (c.u)^2 - 1.5 u^2) and 3 w c.u.
        t0[at] = f0 - a * (f0 - (4 / 9) * even);
        let half = a * (0.5 * (f1 + f2) - (1 / 9) * (even + 4.5 * u * u));
        let odd = b * (0.5 * (f1 - f2) - (1 / 3) * u);
        t1[at] = f1 - half - odd;
        t2[at] = f2 - half + odd;
        half = a * (0.5 * (f3 + f4) - (1 / 9) * (even + 4.5 * v * v));
        odd = b * (0.5 * (f3 - f4) - (1 / 3) * v);
        t3[at] = f3 - half - odd;
        t4[at] = f4 - half + odd;
        const rising = u + v;
        half = a * (0.5 * (f5 + f6) - (1 / 36) * (even + 4.5 * rising * rising));
        odd = b * (0.5 * (f5 - f6) - (1 / 12) * rising);
        t5[at] = f5 - half - odd;
        t6[at] = f6 - half + odd;
        const falling = v - u;
        half = a * (0.5 * (f7 + f8) - (1 / 36) * (even + 4.5 * falling * falling));
        odd = b * (0.5 * (f7 - f8) - (1 / 12) * falling);
        t7[at] = f7 - half - odd;
        t8[at] = f8 - half + odd;
      }
    }
  }
}
