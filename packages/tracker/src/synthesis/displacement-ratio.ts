import type { SynthesisOptions } from './make-dump.js';

/** Lattice points a side, and instants, over which the mean is taken. */
const POINTS = { 2: 48, 3: 16 } as const;
const INSTANTS = 16;

/**
 * Mean displacement a frame interval over the fluid in view, divided by the mean spacing n^(-1/D) of one frame's
 * particles (n a unit of area or volume, solids left out). From the flow itself: speed times interval at the
 * midpoints of a lattice at even instants over the run.
 */
export function displacementRatio(options: SynthesisOptions): number {
  const { flow, region, rate, frames, perFrame, startTime = 0 } = options;
  const points = POINTS[flow.dims];
  const sides = [region.x, region.y, ...(flow.dims === 3 && region.z !== undefined ? [region.z] : [])];
  const at = (axis: number, k: number) => sides[axis][0] + ((sides[axis][1] - sides[axis][0]) * (k + 0.5)) / points;
  const velocity = new Float64Array(3);
  let sum = 0;
  let fluid = 0;
  let all = 0;
  for (let n = 0; n < INSTANTS; n++) {
    const t = startTime + (frames / rate) * ((n + 0.5) / INSTANTS);
    for (let i = 0; i < points; i++) {
      for (let j = 0; j < points; j++) {
        for (let k = 0; k < (flow.dims === 3 ? points : 1); k++) {
          const z = flow.dims === 3 ? at(2, k) : 0;
          all++;
          if (flow.inside?.(at(0, i), at(1, j), z)) continue;
          flow.velocity(at(0, i), at(1, j), z, t, velocity);
          sum += Math.hypot(velocity[0], velocity[1], flow.dims === 3 ? velocity[2] : 0);
          fluid++;
        }
      }
    }
  }
  const room = (sides.reduce((product, [from, to]) => product * (to - from), 1) * fluid) / all;
  const spacing = flow.dims === 3 ? Math.cbrt(room / perFrame) : Math.sqrt(room / perFrame);
  return sum / fluid / rate / spacing;
}
