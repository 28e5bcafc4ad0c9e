import type { Flow } from './flow.js';
import type { WakeData } from './wake-file.js';

/** How the dimensionless wake is set into the world. */
export interface WakePlacement {
  /** Diameter of the cylinder, in the length unit of the run; its centre is the origin. */
  readonly diameter: number;
  /** Speed of the stream along +x, length per s. */
  readonly speed: number;
}

/** A wake as a flow, with what a test or a run sheet wants to know of it. */
export interface WakeFlow extends Flow {
  /** Shedding frequency, 1/s. */
  readonly frequency: number;
  /** Box in which the stored field stands; beyond it the flow is the undisturbed stream. */
  readonly bounds: { readonly x: readonly [number, number]; readonly y: readonly [number, number] };
}

/** Instants a period at which the harmonics are summed up for interpolation in time: 4 to the shortest period of 8 harmonics. */
const PHASES = 32;

/**
 * The stored wake as a flow in time: cubic B-splines through the nodes in x and y and, periodic, through 32 phases
 * of the shedding (M. Unser, IEEE Signal Process. Mag. 16 (1999) 22-38), so that velocity has two continuous
 * derivatives in space and time. Interpolation error of the fourth order in the node distance. No slip and zero
 * velocity inside the body. Cost: 50 MB and about 1 s to make for the shipped field, 0.1 to 0.3 us a call.
 */
export function wakeFlow(wake: WakeData, placement: WakePlacement): WakeFlow {
  const { meta } = wake;
  const { diameter, speed } = placement;
  const across = meta.across;
  const rows = 2 * meta.rows - 1;
  const { spline, lineLength, planeLength } = splineField(wake, across, rows);
  const node = diameter / meta.perDiameter;
  const left = meta.left * diameter;
  const bottom = -(meta.rows - 1) * node;
  const right = left + (across - 1) * node;
  const radius2 = 0.25 * diameter * diameter;
  const frequency = (meta.strouhal * speed) / diameter;
  const weightX = new Float64Array(4);
  const weightY = new Float64Array(4);
  const weightT = new Float64Array(4);
  return {
    name: 'cylinder wake',
    dims: 2,
    frequency,
    bounds: { x: [left, right], y: [bottom, -bottom] },
    inside: (x, y) => x * x + y * y < radius2,
    velocity(x, y, _z, t, into) {
      if (x * x + y * y < radius2) {
        into[0] = 0;
        into[1] = 0;
        return;
      }
      if (!(x >= left && x <= right && y >= bottom && y <= -bottom)) {
        into[0] = speed;
        into[1] = 0;
        return;
      }
      const column = Math.min((x - left) / node, across - 1);
      const row = Math.min((y - bottom) / node, rows - 1);
      const cycle = t * frequency;
      const phase = (cycle - Math.floor(cycle)) * PHASES;
      const i = Math.min(Math.floor(column), across - 2);
      const j = Math.min(Math.floor(row), rows - 2);
      // Just before a whole cycle the difference above rounds to 1.
      const k = Math.min(Math.floor(phase), PHASES - 1);
      splineWeights(column - i, weightX);
      splineWeights(row - j, weightY);
      splineWeights(phase - k, weightT);
      const w0 = weightX[0];
      const w1 = weightX[1];
      const w2 = weightX[2];
      const w3 = weightX[3];
      let u = 0;
      let v = 0;
      for (let c = 0; c < 4; c++) {
        for (let b = 0; b < 4; b++) {
          const at = 2 * ((k + c) * planeLength + (j + b) * lineLength + i);
          const outer = weightT[c] * weightY[b];
          u += outer * (w0 * spline[at] + w1 * spline[at + 2] + w2 * spline[at + 4] + w3 * spline[at + 6]);
          v += outer * (w0 * spline[at + 1] + w1 * spline[at + 3] + w2 * spline[at + 5] + w3 * spline[at + 7]);
        }
      }
      into[0] = speed * u;
      into[1] = speed * v;
    },
  };
}

/** Cubic B-spline weights of the four nodes round a place `share` beyond the second. */
function splineWeights(share: number, into: Float64Array): void {
  const rest = 1 - share;
  into[0] = (rest * rest * rest) / 6;
  into[1] = 2 / 3 - share * share * (1 - 0.5 * share);
  into[2] = 2 / 3 - rest * rest * (1 - 0.5 * rest);
  into[3] = (share * share * share) / 6;
}

/**
 * Spline coefficients over the whole plane, u and v next to each other, with a border of one mirrored node on every
 * side and three phases repeated at the end, so that the sum over 64 coefficients needs no look at the borders.
 */
function splineField(
  wake: WakeData,
  across: number,
  rows: number,
): { spline: Float32Array; lineLength: number; planeLength: number } {
  const { meta, fields } = wake;
  const lineLength = across + 2;
  const planeLength = lineLength * (rows + 2);
  const spline = new Float32Array(2 * (PHASES + 3) * planeLength);
  const whole = new Float64Array(across * rows);
  const middle = meta.rows - 1;
  const terms = 1 + 2 * meta.harmonics;
  for (let component = 0; component < 2; component++) {
    for (let term = 0; term < terms; term++) {
      const harmonic = Math.ceil(term / 2);
      // Half a period later the wake is its own mirror image: u_h(x, -y) = (-1)^h u_h(x, y), v_h with the other sign.
      const sign = (harmonic % 2 === 0 ? 1 : -1) * (component === 0 ? 1 : -1);
      const half = fields[2 * term + component];
      for (let j = 0; j < meta.rows; j++) {
        for (let i = 0; i < across; i++) {
          whole[(middle + j) * across + i] = half[j * across + i];
        }
        prefilter(whole, (middle + j) * across, 1, 1, across);
        for (let i = 0; j > 0 && i < across; i++) {
          whole[(middle - j) * across + i] = sign * whole[(middle + j) * across + i];
        }
      }
      prefilter(whole, 0, across, across, rows);
      // Sampled over a period, a spline through a harmonic has that harmonic's coefficients over (2 + cos) / 3.
      const response = (2 + Math.cos((2 * Math.PI * harmonic) / PHASES)) / 3;
      for (let k = 0; k < PHASES; k++) {
        const angle = (2 * Math.PI * harmonic * k) / PHASES;
        const factor = (term % 2 === 1 ? Math.cos(angle) : term === 0 ? 1 : Math.sin(angle)) / response;
        if (factor === 0) continue;
        // Phase k stands at k + 1, since the spline at phase k reaches from k - 1 to k + 2.
        const plane = (k + 1) * planeLength;
        for (let j = middle; j < rows; j++) {
          let to = 2 * (plane + (j + 1) * lineLength + 1) + component;
          const line = j * across;
          for (let i = 0; i < across; i++, to += 2) spline[to] += factor * whole[line + i];
        }
      }
    }
  }
  for (let k = 0; k < PHASES; k++) {
    // The lower half of the plane is the upper one half a period on, v with the other sign.
    const other = ((k + PHASES / 2) % PHASES) + 1;
    for (let j = 1; j <= middle; j++) {
      let to = 2 * ((k + 1) * planeLength + (middle - j + 1) * lineLength + 1);
      let from = 2 * (other * planeLength + (middle + j + 1) * lineLength + 1);
      for (let i = 0; i < across; i++, to += 2, from += 2) {
        spline[to] = spline[from];
        spline[to + 1] = -spline[from + 1];
      }
    }
  }
  for (let k = 1; k <= PHASES; k++)
    mirrorBorder(spline.subarray(2 * k * planeLength, 2 * (k + 1) * planeLength), across, rows);
  spline.copyWithin(0, 2 * PHASES * planeLength, 2 * (PHASES + 1) * planeLength);
  spline.copyWithin(2 * (PHASES + 1) * planeLength, 2 * planeLength, 6 * planeLength);
  return { spline, lineLength, planeLength };
}

function mirrorBorder(plane: Float32Array, across: number, rows: number): void {
  const line = 2 * (across + 2);
  for (let j = 1; j <= rows; j++) {
    for (let c = 0; c < 2; c++) {
      plane[j * line + c] = plane[j * line + 4 + c];
      plane[j * line + 2 * (across + 1) + c] = plane[j * line + 2 * (across - 1) + c];
    }
  }
  plane.copyWithin(0, 2 * line, 3 * line);
  plane.copyWithin((rows + 1) * line, (rows - 1) * line, rows * line);
}

/** Pole of the cubic spline's inverse filter, sqrt(3) - 2 (Unser 1999). */
const POLE = Math.sqrt(3) - 2;

/**
 * Turns samples into cubic spline coefficients in place, mirrored at both ends (Unser 1999): `lanes` neighbouring
 * sequences at once, each of `length` values `stride` apart, the first beginning at `start`.
 */
function prefilter(values: Float64Array, start: number, stride: number, lanes: number, length: number): void {
  const last = start + (length - 1) * stride;
  for (let lane = 0; lane < lanes; lane++) {
    let sum = 0;
    let power = 1;
    for (let k = 0; k < Math.min(length, 40); k++, power *= POLE) sum += power * values[start + lane + k * stride];
    values[start + lane] = sum;
  }
  for (let row = start + stride; row <= last; row += stride) {
    for (let at = row; at < row + lanes; at++) values[at] += POLE * values[at - stride];
  }
  for (let at = last; at < last + lanes; at++) {
    values[at] = (POLE / (POLE * POLE - 1)) * (values[at] + POLE * values[at - stride]);
  }
  for (let row = last - stride; row >= start; row -= stride) {
    for (let at = row; at < row + lanes; at++) values[at] = POLE * (values[at + stride] - values[at]);
  }
  for (let row = start; row <= last; row += stride) {
    for (let at = row; at < row + lanes; at++) values[at] *= 6;
  }
}
