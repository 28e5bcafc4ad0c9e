import type { Dims } from '../core/columns.js';

/** Terms of a full quadratic: 1 x y xx xy yy; 1 x y z xx xy yy xz yz zz. */
export const TERMS = { 2: 6, 3: 10 } as const;

/** Links about a place as columns: middle, velocity, weight, and the pathline they belong to. */
export interface LinkColumns {
  readonly x: Float64Array;
  readonly y: Float64Array;
  readonly z: Float64Array;
  readonly u: Float64Array;
  readonly v: Float64Array;
  readonly w: Float64Array;
  readonly trust: Float64Array;
  readonly tag: Int32Array;
}

/**
 * Sums of a weighted quadratic fit of the velocities of `found` links about a place: upper half of the normal matrix
 * in `matrix` (row-major, TERMS squared), right sides u v w in `right` (4 a term); returns the weighted sum of squared
 * velocities. Offsets are in units of the radius (`per` its inverse, `perZ` along z), weights (1 - r^2)^2 times trust.
 * The link tagged `without` is left out. Cost about 60 (150 in space) operations a link.
 */
export function sumAbout(
  dims: Dims,
  links: LinkColumns,
  near: Int32Array,
  found: number,
  place: Float64Array,
  per: number,
  perZ: number,
  without: number,
  matrix: Float64Array,
  right: Float64Array,
): number {
  return dims === 2
    ? sumInPlane(links, near, found, place[0], place[1], per, without, matrix, right)
    : sumInSpace(links, near, found, place, per, perZ, without, matrix, right);
}

function sumInPlane(
  { x, y, u, v, trust, tag }: LinkColumns,
  near: Int32Array,
  found: number,
  px: number,
  py: number,
  per: number,
  without: number,
  matrix: Float64Array,
  right: Float64Array,
): number {
  let s = 0;
  let sx = 0;
  let sy = 0;
  let sxx = 0;
  let sxy = 0;
  let syy = 0;
  let sxxx = 0;
  let sxxy = 0;
  let sxyy = 0;
  let syyy = 0;
  let sxxxx = 0;
  let sxxxy = 0;
  let sxxyy = 0;
  let sxyyy = 0;
  let syyyy = 0;
  let u0 = 0;
  let ux = 0;
  let uy = 0;
  let uxx = 0;
  let uxy = 0;
  let uyy = 0;
  let v0 = 0;
  let vx = 0;
  let vy = 0;
  let vxx = 0;
  let vxy = 0;
  let vyy = 0;
  let squares = 0;
  for (let n = 0; n < found; n++) {
    const j = near[n];
    if (tag[j] === without) continue;
    const dx = (x[j] - px) * per;
    const dy = (y[j] - py) * per;
    const xx = dx * dx;
    const yy = dy * dy;
    const r = 1 - xx - yy;
    if (r <= 0) continue;
    const g = r * r * trust[j];
    const xy = dx * dy;
    const gx = g * dx;
    const gy = g * dy;
    const gxx = g * xx;
    const gxy = g * xy;
    const gyy = g * yy;
    s += g;
    sx += gx;
    sy += gy;
    sxx += gxx;
    sxy += gxy;
    syy += gyy;
    sxxx += gxx * dx;
    sxxy += gxx * dy;
    sxyy += gyy * dx;
    syyy += gyy * dy;
    sxxxx += gxx * xx;
    sxxxy += gxx * xy;
    sxxyy += gxx * yy;
    sxyyy += gyy * xy;
    syyyy += gyy * yy;
    const a = u[j];
    const b = v[j];
    u0 += g * a;
    ux += gx * a;
    uy += gy * a;
    uxx += gxx * a;
    uxy += gxy * a;
    uyy += gyy * a;
    v0 += g * b;
    vx += gx * b;
    vy += gy * b;
    vxx += gxx * b;
    vxy += gxy * b;
    vyy += gyy * b;
    squares += g * (a * a + b * b);
  }
  matrix[0] = s;
  matrix[1] = sx;
  matrix[2] = sy;
  matrix[3] = sxx;
  matrix[4] = sxy;
  matrix[5] = syy;
  matrix[7] = sxx;
  matrix[8] = sxy;
  matrix[9] = sxxx;
  matrix[10] = sxxy;
  matrix[11] = sxyy;
  matrix[14] = syy;
  matrix[15] = sxxy;
  matrix[16] = sxyy;
  matrix[17] = syyy;
  matrix[21] = sxxxx;
  matrix[22] = sxxxy;
  matrix[23] = sxxyy;
  matrix[28] = sxxyy;
  matrix[29] = sxyyy;
  matrix[35] = syyyy;
  right[0] = u0;
  right[1] = v0;
  right[4] = ux;
  right[5] = vx;
  right[8] = uy;
  right[9] = vy;
  right[12] = uxx;
  right[13] = vxx;
  right[16] = uxy;
  right[17] = vxy;
  right[20] = uyy;
  right[21] = vyy;
  return squares;
}

function sumInSpace(
  { x, y, z, u, v, w, trust, tag }: LinkColumns,
  near: Int32Array,
  found: number,
  [px, py, pz]: Float64Array,
  per: number,
  perZ: number,
  without: number,
  matrix: Float64Array,
  right: Float64Array,
): number {
  const depth = perZ / per;
  const terms = TERMS[3];
  const f = [1, 0, 0, 0, 0, 0, 0, 0, 0, 0];
  matrix.fill(0);
  right.fill(0);
  let squares = 0;
  for (let n = 0; n < found; n++) {
    const j = near[n];
    if (tag[j] === without) continue;
    const dx = (x[j] - px) * per;
    const dy = (y[j] - py) * per;
    const dz = (z[j] - pz) * perZ;
    const r = 1 - dx * dx - dy * dy - dz * dz;
    if (r <= 0) continue;
    const g = r * r * trust[j];
    f[1] = dx;
    f[2] = dy;
    f[3] = dz;
    f[4] = dx * dx;
    f[5] = dx * dy;
    f[6] = dy * dy;
    f[7] = dx * dz;
    f[8] = dy * dz;
    f[9] = dz * dz;
    const a = u[j];
    const b = v[j];
    const c = w[j];
    squares += g * (a * a + b * b + c * depth * (c * depth));
    let at = 0;
    for (let m = 0; m < terms; m++) {
      const gf = g * f[m];
      at = m * terms;
      for (let k = m; k < terms; k++) matrix[at + k] += gf * f[k];
      right[4 * m] += gf * a;
      right[4 * m + 1] += gf * b;
      right[4 * m + 2] += gf * c;
    }
  }
  return squares;
}
