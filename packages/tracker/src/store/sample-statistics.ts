import { EXCLUDED_FROM_GRID, FLAG, type FlagName } from '../core/columns.js';
import type { PathlineRows } from './pathline-rows.js';

/** Figures over all samples. Speeds and standard errors: samples that carry no flag that excludes them. */
export interface SampleFigures {
  readonly flagged: Readonly<Record<FlagName, number>>;
  readonly linksBridging: number;
  readonly unflagged: number;
  readonly meanSpeed: number;
  readonly peakSpeed: number;
  /** Median u_se, to a relative 2^-13 (0.013 %): from a histogram over the leading bits. */
  readonly medianVelocitySe: number;
}

/** Counts samples as they come in pathline order; memory 4 MB. */
export interface SampleStatistics {
  add(rows: PathlineRows): void;
  figures(): SampleFigures;
}

/** Bits of a Float32 left out of the histogram: sign, exponent and 12 bits of the fraction stay. */
const DROPPED_BITS = 11;

export function sampleStatistics(frameStep = 1): SampleStatistics {
  const byFlags = new Float64Array(1 << 16);
  const histogram = new Uint32Array(0x7f800000 >>> DROPPED_BITS);
  const bits = new Uint32Array(1);
  const single = new Float32Array(bits.buffer);
  let linksBridging = 0;
  let unflagged = 0;
  let speeds = 0;
  let sum = 0;
  let peak = 0;
  let errors = 0;
  return {
    add(rows) {
      const { u, v, w, uSe, flags, frame, pathline } = rows;
      for (let i = 0; i < flags.length; i++) {
        byFlags[flags[i]]++;
        if (i > 0 && pathline[i] === pathline[i - 1] && frame[i] - frame[i - 1] > frameStep) linksBridging++;
        if ((flags[i] & EXCLUDED_FROM_GRID) !== 0) continue;
        unflagged++;
        const depth = w.length > 0 ? w[i] : 0;
        const speed = Math.sqrt(u[i] * u[i] + v[i] * v[i] + depth * depth);
        // Not-a-number: a sample without a velocity (a pathline too short for a fit).
        if (!Number.isNaN(speed)) {
          speeds++;
          sum += speed;
          if (speed > peak) peak = speed;
        }
        single[0] = uSe[i];
        if (bits[0] < 0x7f800000) {
          histogram[bits[0] >>> DROPPED_BITS]++;
          errors++;
        }
      }
    },
    figures() {
      const flagged = {} as Record<FlagName, number>;
      for (const [name, bit] of Object.entries(FLAG) as [FlagName, number][]) {
        flagged[name] = 0;
        for (let mask = bit; mask < byFlags.length; mask++) if ((mask & bit) !== 0) flagged[name] += byFlags[mask];
      }
      let bin = 0;
      for (let seen = histogram[0]; 2 * seen < errors; seen += histogram[bin]) bin++;
      bits[0] = ((bin << DROPPED_BITS) | (1 << (DROPPED_BITS - 1))) >>> 0;
      return {
        flagged,
        linksBridging,
        unflagged,
        meanSpeed: speeds === 0 ? Number.NaN : sum / speeds,
        peakSpeed: speeds === 0 ? Number.NaN : peak,
        medianVelocitySe: errors === 0 ? Number.NaN : bin === 0 ? 0 : single[0],
      };
    },
  };
}
