import { medianOfFew } from '../math/median.js';
import type { NearestFew } from '../math/nearest-few.js';

/** Neighbours beyond the number of coefficients that a plane needs for its residuals to mean anything. */
const LEAST_REDUNDANCY = 3;

/** Pivot of the normal equations, over its value before elimination, below which the neighbours do not span a plane. */
const FLAT = 1e-6;

/**
 * Normalised residual against the plane (in a volume: the linear field) through the neighbours of a sample: the
 * velocity less the plane's value there, over the median residual of the neighbours plus epsilon, the median widened
 * by sqrt(n / (n - p)) because n residuals of a fit with p coefficients have n - p degrees of freedom. The place of
 * the published test (`normalisedMedianResidual`) where the flow has a gradient on the scale of the seeding.
 */
export class PlaneTest {
  private readonly search: NearestFew;
  private readonly design: Float64Array;
  private readonly sizes: Float64Array;
  private readonly normal = new Float64Array(20);

  constructor(search: NearestFew, neighbours: number) {
    this.search = search;
    this.design = new Float64Array(4 * neighbours);
    this.sizes = new Float64Array(neighbours);
  }

  /** Distance of the judged sample from the plane, of the last call of `residual`; NaN where there was none. */
  deviation = Number.NaN;

  /** `velocity` by slot; the search must know the neighbours of `own`. NaN where they determine no plane. */
  residual(velocity: Float64Array, own: number, found: number, epsilon: number): number {
    const spread = this.spread(velocity, own, found, -1);
    return this.deviation / (spread + epsilon);
  }

  /** Widened median distance of the neighbours of `own` from their plane, neighbour `without` left out; NaN where there is none. */
  spread(velocity: Float64Array, own: number, found: number, without: number): number {
    const { search, design, sizes, normal } = this;
    const { slots, px, py, pz, dims } = search;
    const p = dims + 1;
    this.deviation = Number.NaN;
    const base = search.k * own;
    const far = slots[base + found - 1]!;
    let reach = Math.abs(px[far]! - px[own]!) + Math.abs(py[far]! - py[own]!);
    if (dims === 3) reach += Math.abs(pz[far]! - pz[own]!);
    if (!(reach > 0)) return Number.NaN;
    const scale = 1 / reach;
    if (dims === 2) return this.spreadInPlane(velocity, own, found, without, scale);
    normal.fill(0);
    const q = p + 1;
    let n = 0;
    for (let i = 0; i < found; i++) {
      const slot = slots[base + i]!;
      if (slot === without) continue;
      const at = 4 * n;
      design[at] = 1;
      design[at + 1] = (px[slot]! - px[own]!) * scale;
      design[at + 2] = (py[slot]! - py[own]!) * scale;
      if (dims === 3) design[at + 3] = (pz[slot]! - pz[own]!) * scale;
      const value = velocity[slot]! - velocity[own]!;
      sizes[n++] = value;
      for (let a = 0; a < p; a++) {
        for (let b = a; b < p; b++) normal[a * q + b] = normal[a * q + b]! + design[at + a]! * design[at + b]!;
        normal[a * q + p] = normal[a * q + p]! + design[at + a]! * value;
      }
    }
    if (n < p + LEAST_REDUNDANCY || !eliminate(normal, p)) return Number.NaN;
    for (let i = 0; i < n; i++) {
      let value = sizes[i]!;
      for (let a = 0; a < p; a++) value -= normal[a * q + p]! * design[4 * i + a]!;
      sizes[i] = Math.abs(value);
    }
    this.deviation = Math.abs(normal[p]!);
    return medianOfFew(sizes, n) * Math.sqrt(n / (n - p));
  }

  /** The same in the plane, written out: the same operations in the same order, several times as fast. */
  private spreadInPlane(velocity: Float64Array, own: number, found: number, without: number, scale: number): number {
    const { search, design, sizes } = this;
    const { slots, px, py } = search;
    const base = search.k * own;
    const x0 = px[own]!;
    const y0 = py[own]!;
    const v0 = velocity[own]!;
    let sx = 0;
    let sy = 0;
    let sv = 0;
    let sxx = 0;
    let sxy = 0;
    let syy = 0;
    let sxv = 0;
    let syv = 0;
    let n = 0;
    for (let i = 0; i < found; i++) {
      const slot = slots[base + i]!;
      if (slot === without) continue;
      const x = (px[slot]! - x0) * scale;
      const y = (py[slot]! - y0) * scale;
      const v = velocity[slot]! - v0;
      design[2 * n] = x;
      design[2 * n + 1] = y;
      sizes[n++] = v;
      sx += x;
      sy += y;
      sv += v;
      sxx += x * x;
      sxy += x * y;
      sxv += x * v;
      syy += y * y;
      syv += y * v;
    }
    if (n < 3 + LEAST_REDUNDANCY) return Number.NaN;
    // Elimination as in `eliminate`: rows divided by their pivots.
    const mx = sx / n;
    const my = sy / n;
    const mv = sv / n;
    const xFactor = mx * n;
    const xPivot = sxx - xFactor * mx;
    if (!(xPivot > sxx * FLAT)) return Number.NaN;
    const xy = (sxy - xFactor * my) / xPivot;
    const xv = (sxv - xFactor * mv) / xPivot;
    const yFactor = my * n;
    const yByX = xy * xPivot;
    const yPivot = syy - yFactor * my - yByX * xy;
    if (!(yPivot > syy * FLAT)) return Number.NaN;
    const alongY = (syv - yFactor * mv - yByX * xv) / yPivot;
    const alongX = xv - xy * alongY;
    const level = mv - mx * alongX - my * alongY;
    for (let i = 0; i < n; i++)
      sizes[i] = Math.abs(sizes[i]! - level - alongX * design[2 * i]! - alongY * design[2 * i + 1]!);
    this.deviation = Math.abs(level);
    return medianOfFew(sizes, n) * Math.sqrt(n / (n - 3));
  }
}

/** Solves symmetric positive equations, upper triangle and right-hand side in rows of p + 1; the answer replaces the latter. */
function eliminate(m: Float64Array, p: number): boolean {
  const q = p + 1;
  for (let a = 0; a < p; a++) {
    const before = m[a * q + a]!;
    for (let k = 0; k < a; k++) {
      // Row k is already divided by its pivot, which stands on the diagonal.
      const factor = m[k * q + a]! * m[k * q + k]!;
      for (let b = a; b <= p; b++) m[a * q + b] = m[a * q + b]! - factor * m[k * q + b]!;
    }
    const pivot = m[a * q + a]!;
    if (!(pivot > before * FLAT)) return false;
    for (let b = a + 1; b <= p; b++) m[a * q + b] = m[a * q + b]! / pivot;
  }
  for (let a = p - 1; a >= 0; a--) {
    for (let b = a + 1; b < p; b++) m[a * q + p] = m[a * q + p]! - m[a * q + b]! * m[b * q + p]!;
  }
  return true;
}
