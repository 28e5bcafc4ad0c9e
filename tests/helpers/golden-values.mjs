// What the golden folders hold, in closed form with numbers that are exact in 32 and 64 bits.

export const FRAMES = 8;
/** Provisional pathlines; number 2 has a single sample and is dropped, the later ones move up by one. */
export const PATHLINES = 6;
/** Final numbers of the provisional pathlines. */
export const FINAL = [0, 1, null, 2, 3, 4];

/** Sample of provisional pathline `p` in frame step `k`, null where it has none. Pathline 4 misses step 3; 5 stands still. */
export function goldenSample(p, k) {
  if (p === 2 && k !== 0) return null;
  if (p === 4 && k === 3) return null;
  const moving = p === 5 ? 0 : 1;
  return {
    provisional: p,
    frame: 100 + 2 * k,
    time: k / 4,
    x: 8 * p + moving * 0.5 * k,
    y: -4 * p + moving * 0.25 * k * k,
    u: moving * 2,
    v: moving * 2 * k,
    ax: p === 1 ? Number.NaN : 0,
    ay: moving * 8,
    xSe: 0.125,
    ySe: 0.25,
    uSe: 0.5,
    vSe: 0.75,
    axSe: 1.5,
    aySe: 2.5,
    measuredX: 8 * p + moving * 0.5 * k + 0.0625,
    measuredY: -4 * p + moving * 0.25 * k * k - 0.0625,
    linkRisk: k === 0 ? 0 : 0.03125,
    detection: 2 ** 40 + 16 * k + p,
    // near-end at both ends, bridged where step 3 is missing; `stuck` (1) comes from the writer.
    flags: (k === 0 || k === FRAMES - 1 ? 4 : 0) | (p === 4 && k === 4 ? 2 : 0),
  };
}

/** A grid of 3 by 2 overlapping bins; bin 4 is empty. */
export function goldenGrid() {
  const field = (unit, longName, standardError, first) => ({
    values: Float32Array.from({ length: 6 }, (_, i) => (i === 4 ? Number.NaN : first + i / 8)),
    unit,
    longName,
    standardError,
  });
  return {
    shape: { dims: 2, count: [3, 2, 1], first: [0.5, 1.5, 0], step: [0.75, 0.75, 1], size: [1, 1, 1] },
    samples: Float64Array.from({ length: 6 }, (_, i) => (i === 4 ? 0 : 10 + i)),
    pathlines: Float64Array.from({ length: 6 }, (_, i) => (i === 4 ? 0 : 1 + i)),
    fields: new Map([
      ['u', field('mm/s', 'mean velocity along x', 'u_se', 2)],
      ['u_se', field('mm/s', 'standard error of u', null, 0.5)],
    ]),
  };
}
