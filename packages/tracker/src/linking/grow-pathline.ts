import type { ActivePathlines } from './active-pathlines.js';
import type { FlowGrid } from './flow-grid.js';

/** Weight of the newest link in a pathline's own deviation from the flow picture. */
const DEVIATION_GAIN = 0.5;
/** Detections beyond which more tell nothing new. */
const AGE_CAP = 200;

/** One detection of the frame. */
export interface Place {
  readonly x: number;
  readonly y: number;
  readonly z: number;
  readonly time: number;
}

/** Appends a pathline that begins with this detection to `to`. */
export function beginPathline(to: ActivePathlines, id: number, place: Place): void {
  const j = append(to, id, place);
  to.age[j] = 1;
  to.u[j] = to.v[j] = to.w[j] = Number.NaN;
  to.u0[j] = to.v0[j] = to.w0[j] = Number.NaN;
  to.mx[j] = to.my[j] = to.mz[j] = Number.NaN;
  to.du[j] = to.dv[j] = to.dw[j] = 0;
}

/** Appends entry `i` of `from`, grown by this detection, to `to`. `flow` is borrowed as scratch [3]. */
export function growPathline(
  from: ActivePathlines,
  i: number,
  to: ActivePathlines,
  place: Place,
  picture: FlowGrid,
  flow: Float64Array,
): void {
  const j = append(to, from.id[i], place);
  const perStep = 1 / (place.time - from.time[i]);
  const u = (place.x - from.x[i]) * perStep;
  const v = (place.y - from.y[i]) * perStep;
  const w = (place.z - from.z[i]) * perStep;
  const mx = 0.5 * (place.x + from.x[i]);
  const my = 0.5 * (place.y + from.y[i]);
  const mz = 0.5 * (place.z + from.z[i]);
  const age = from.age[i];
  const known = picture.at(mx, my, mz, flow) > 0 ? 1 : 0;
  const gain = age < 2 ? 1 : DEVIATION_GAIN;
  to.u[j] = u;
  to.v[j] = v;
  to.w[j] = w;
  to.mx[j] = mx;
  to.my[j] = my;
  to.mz[j] = mz;
  to.u0[j] = from.u[i];
  to.v0[j] = from.v[i];
  to.w0[j] = from.w[i];
  to.du[j] = from.du[i] + gain * (known * (u - flow[0]) - from.du[i]);
  to.dv[j] = from.dv[i] + gain * (known * (v - flow[1]) - from.dv[i]);
  to.dw[j] = from.dw[i] + gain * (known * (w - flow[2]) - from.dw[i]);
  to.age[j] = age < AGE_CAP ? age + 1 : AGE_CAP;
}

function append(to: ActivePathlines, id: number, place: Place): number {
  const j = to.count++;
  to.id[j] = id;
  to.x[j] = place.x;
  to.y[j] = place.y;
  to.z[j] = place.z;
  to.time[j] = place.time;
  to.missed[j] = 0;
  return j;
}
