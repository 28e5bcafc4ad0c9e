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
  /** Where and when it was last detected; as x, y, z, time unless it missed frames. */
  rx = new Float64Array(0);
  ry = new Float64Array(0);
  rz = new Float64Array(0);
  rtime = new Float64Array(0);
  /** Where it is expected in the frame at hand. */
  px = new Float64Array(0);
  py = new Float64Array(0);
  pz = new Float64Array(0);
  /** Velocity over the last link, at its middle; NaN for a pathline with one detection. */
  u = new Float64Array(0);
  v = new Float64Array(0);
  w = new Float64Array(0);
  /** Velocity of the flow about it in the frame at hand, NaN: not looked at. */
  fu = new Float64Array(0);
  fv = new Float64Array(0);
  fw = new Float64Array(0);
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

  /** Notes the velocity of the flow about entry `i`. */
  noteFlow(i: number, flow: Float64Array): void {
    this.fu[i] = flow[0];
    this.fv[i] = flow[1];
    this.fw[i] = flow[2];
  }

  /** Entry `i` missed the frame at `time`: it goes on from where it was expected. */
  miss(i: number, time: number): void {
    const per = 1 / (time - this.time[i]);
    if (this.age[i] >= 2) {
      this.u[i] = (this.px[i] - this.x[i]) * per;
      this.v[i] = (this.py[i] - this.y[i]) * per;
      this.w[i] = (this.pz[i] - this.z[i]) * per;
    }
    this.x[i] = this.px[i];
    this.y[i] = this.py[i];
    this.z[i] = this.pz[i];
    this.time[i] = time;
    this.missed[i]++;
  }

  /** Appends entry `i` of `from` with one more missed frame. */
  carry(from: ActivePathlines, i: number): void {
    const j = this.count++;
    this.id[j] = from.id[i];
    this.x[j] = from.x[i];
    this.y[j] = from.y[i];
    this.z[j] = from.z[i];
    this.time[j] = from.time[i];
    this.rx[j] = from.rx[i];
    this.ry[j] = from.ry[i];
    this.rz[j] = from.rz[i];
    this.rtime[j] = from.rtime[i];
    this.fu[j] = Number.NaN;
    this.u[j] = from.u[i];
    this.v[j] = from.v[i];
    this.w[j] = from.w[i];
    this.du[j] = from.du[i];
    this.dv[j] = from.dv[i];
    this.dw[j] = from.dw[i];
    this.age[j] = from.age[i];
    this.missed[j] = from.missed[i];
  }
}

const ACTIVE_FLOATS = [
  'x',
  'y',
  'z',
  'time',
  'fu',
  'fv',
  'fw',
  'px',
  'py',
  'pz',
  'rx',
  'ry',
  'rz',
  'rtime',
  'u',
  'v',
  'w',
  'du',
  'dv',
  'dw',
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
