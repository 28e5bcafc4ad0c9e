import type { ActivePathlines } from './active-pathlines.js';
import type { LastStep } from './last-step.js';

/** Weight of the newest link in a pathline's own deviation from the flow about it. */
const DEVIATION_GAIN = 0.5;
/** Detections beyond which more tell nothing new. */
const AGE_CAP = 200;

/** Appends a pathline that begins with a detection to `to`. */
export function beginPathline(to: ActivePathlines, id: number, x: number, y: number, z: number, time: number): void {
  const j = append(to, id, x, y, z, time);
  to.age[j] = 1;
  to.u[j] = to.v[j] = to.w[j] = Number.NaN;
  to.du[j] = to.dv[j] = to.dw[j] = Number.NaN;
}

/** Appends entry `i` of `from`, grown by a detection that it reached with `step`, to `to`. */
export function growPathline(
  from: ActivePathlines,
  i: number,
  to: ActivePathlines,
  x: number,
  y: number,
  z: number,
  time: number,
  step: LastStep,
): void {
  const j = append(to, from.id[i], x, y, z, time);
  to.u[j] = step.u;
  to.v[j] = step.v;
  to.w[j] = step.w;
  // Own deviation from the flow about it, if that was looked at.
  if (Number.isNaN(from.fu[i])) to.du[j] = to.dv[j] = to.dw[j] = Number.NaN;
  else {
    const first = Number.isNaN(from.du[i]);
    const gain = first ? 1 : DEVIATION_GAIN;
    const kept = 1 - gain;
    to.du[j] = gain * (step.u - from.fu[i]) + (first ? 0 : kept * from.du[i]);
    to.dv[j] = gain * (step.v - from.fv[i]) + (first ? 0 : kept * from.dv[i]);
    to.dw[j] = gain * (step.w - from.fw[i]) + (first ? 0 : kept * from.dw[i]);
  }
  const age = from.age[i];
  to.age[j] = age < AGE_CAP ? age + 1 : AGE_CAP;
}

function append(to: ActivePathlines, id: number, x: number, y: number, z: number, time: number): number {
  const j = to.count++;
  to.id[j] = id;
  to.x[j] = to.rx[j] = x;
  to.y[j] = to.ry[j] = y;
  to.z[j] = to.rz[j] = z;
  to.time[j] = to.rtime[j] = time;
  to.missed[j] = 0;
  to.fu[j] = Number.NaN;
  return j;
}
