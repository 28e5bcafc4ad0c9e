import type { ActivePathlines } from './active-pathlines.js';

/** The last step of a pathline that reaches a place: velocity and middle. */
export class LastStep {
  u = 0;
  v = 0;
  w = 0;
  mx = 0;
  my = 0;
  mz = 0;

  /** From entry `i` to (x, y, z) at `time`, which was predicted at (px, py, pz): over missed frames the way was bent as predicted. */
  take(from: ActivePathlines, i: number, x: number, y: number, z: number, time: number): void {
    const px = from.px[i];
    const py = from.py[i];
    const pz = from.pz[i];
    const per = 1 / (time - from.rtime[i]);
    this.u = (x - from.rx[i]) * per;
    this.v = (y - from.ry[i]) * per;
    this.w = (z - from.rz[i]) * per;
    const step = time - from.time[i];
    if (from.missed[i] > 0 && from.time[i] > from.rtime[i]) {
      const last = 1 / step;
      this.u += (px - from.x[i]) * last - (px - from.rx[i]) * per;
      this.v += (py - from.y[i]) * last - (py - from.ry[i]) * per;
      this.w += (pz - from.z[i]) * last - (pz - from.rz[i]) * per;
    }
    this.mx = x - 0.5 * step * this.u;
    this.my = y - 0.5 * step * this.v;
    this.mz = z - 0.5 * step * this.w;
  }
}
