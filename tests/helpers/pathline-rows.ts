import type { PathlineRows } from '@wakeloom/tracker/eulerian/accumulate';

/** One sample in pathline order, velocities in double precision. */
export interface BinSample {
  readonly pathline: number;
  readonly x: number;
  readonly y: number;
  readonly z?: number;
  readonly u: number;
  readonly v: number;
  readonly w?: number;
  readonly uSe?: number;
  readonly vSe?: number;
  readonly wSe?: number;
  readonly flags?: number;
}

/** Rows of whole pathlines from samples that stand pathline by pathline. */
export function pathlineRows(samples: readonly BinSample[]): PathlineRows {
  const column = (of: (sample: BinSample) => number | undefined) => Float64Array.from(samples, (one) => of(one) ?? 0);
  const starts = samples.map((_, i) => i).filter((i) => i === 0 || samples[i]!.pathline !== samples[i - 1]!.pathline);
  return {
    x: column((one) => one.x),
    y: column((one) => one.y),
    z: column((one) => one.z),
    u: column((one) => one.u),
    v: column((one) => one.v),
    w: column((one) => one.w),
    uSe: column((one) => one.uSe),
    vSe: column((one) => one.vSe),
    wSe: column((one) => one.wSe),
    flags: Uint16Array.from(samples, (one) => one.flags ?? 0),
    rowStart: Uint32Array.from([...starts, samples.length]),
  };
}
