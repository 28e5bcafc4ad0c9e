/**
 * Pathlines that may still grow, as columns: one entry each, in the order of the detections they ended at, so
 * that neighbours in the list are neighbours in space. Two sets are kept and swapped from frame to frame.
 */
export class ActivePathlines {
  count = 0;
  id = new Int32Array(0);
  /** Last position, link space (length unit). */
  x = new Float64Array(0);
  y = new Float64Array(0);
  z = new Float64Array(0);
  /** Time of the last detection. */
  time = new Float64Array(0);
  /** Velocity over the last link, at its middle; NaN for a pathline with one detection. */
  u = new Float64Array(0);
  v = new Float64Array(0);
  w = new Float64Array(0);
  /** Velocity over the link before; NaN with fewer than three detections. */
  u0 = new Float64Array(0);
  v0 = new Float64Array(0);
  w0 = new Float64Array(0);
  /** Middle of the last link. */
  mx = new Float64Array(0);
  my = new Float64Array(0);
  mz = new Float64Array(0);
  /** Own deviation from the flow picture, averaged over the last links. */
  du = new Float64Array(0);
  dv = new Float64Array(0);
  dw = new Float64Array(0);
  /** Detections so far, capped where more tells nothing new. */
  age = new Uint8Array(0);
  /** Frames missed since the last detection. */
  missed = new Uint8Array(0);

  reserve(count: number): void {
    if (this.id.length >= count) return;
    const size = Math.ceil(count * 1.5) + 64;
    this.id = copyInt(this.id, size);
    for (const name of ACTIVE_FLOATS) this[name] = copyFloat(this[name], size);
    const age = new Uint8Array(size);
    age.set(this.age);
    this.age = age;
    const missed = new Uint8Array(size);
    missed.set(this.missed);
    this.missed = missed;
  }

  /** Appends entry `i` of `from` with one more missed frame. */
  carry(from: ActivePathlines, i: number): void {
    const j = this.count++;
    this.id[j] = from.id[i];
    this.x[j] = from.x[i];
    this.y[j] = from.y[i];
    this.z[j] = from.z[i];
    this.time[j] = from.time[i];
    this.u[j] = from.u[i];
    this.v[j] = from.v[i];
    this.w[j] = from.w[i];
    this.u0[j] = from.u0[i];
    this.v0[j] = from.v0[i];
    this.w0[j] = from.w0[i];
    this.du[j] = from.du[i];
    this.dv[j] = from.dv[i];
    this.dw[j] = from.dw[i];
    this.mx[j] = from.mx[i];
    this.my[j] = from.my[i];
    this.mz[j] = from.mz[i];
    this.age[j] = from.age[i];
    this.missed[j] = from.missed[i];
  }
}

const ACTIVE_FLOATS = [
  'x',
  'y',
  'z',
  'time',
  'u',
  'v',
  'w',
  'u0',
  'v0',
  'w0',
  'du',
  'dv',
  'dw',
  'mx',
  'my',
  'mz',
] as const;

function copyInt(old: Int32Array, size: number): Int32Array<ArrayBuffer> {
  const fresh = new Int32Array(size);
  fresh.set(old);
  return fresh;
}

function copyFloat(old: Float64Array, size: number): Float64Array<ArrayBuffer> {
  const fresh = new Float64Array(size);
  fresh.set(old);
  return fresh;
}
