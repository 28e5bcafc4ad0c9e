/** Tick positions on an axis, and how many decimals tell them apart. */
export interface Ticks {
  /** Ascending, multiples of `step` inside the range. */
  readonly values: readonly number[];
  readonly step: number;
  /** Digits after the decimal point that each label needs. */
  readonly decimals: number;
}

/**
 * Round tick positions (steps of 1, 2 or 5 times a power of ten) inside `low .. high`, about `wanted` of them.
 * An empty or reversed range gives the one tick at `low`.
 */
export function niceTicks(low: number, high: number, wanted = 6): Ticks {
  const span = high - low;
  if (!(span > 0) || !Number.isFinite(span)) return { values: Number.isFinite(low) ? [low] : [], step: 0, decimals: 0 };
  const step = niceStep(span / Math.max(1, wanted));
  const decimals = Math.max(0, -Math.floor(Math.log10(step) + 1e-9));
  // Half an ulp of the range would lose an end tick that is exactly on the border; 1e-9 of a step cannot be seen.
  const first = Math.ceil(low / step - 1e-9);
  const last = Math.floor(high / step + 1e-9);
  const values: number[] = [];
  // Adding 0 turns -0 into 0, which would be labelled "-0".
  for (let i = first; i <= last; i++) values.push(i * step + 0);
  return { values, step, decimals };
}

/** The smallest of 1, 2, 5 times a power of ten that is not below `raw` (within 1e-9). */
export function niceStep(raw: number): number {
  const power = 10 ** Math.floor(Math.log10(raw) + 1e-9);
  const mantissa = raw / power;
  for (const nice of [1, 2, 5]) if (mantissa <= nice * (1 + 1e-9)) return nice * power;
  return 10 * power;
}

/** Text of a tick with the decimals of its axis; a true minus sign. Large and tiny values in powers of ten. */
export function tickLabel(value: number, ticks: Ticks): string {
  if (value === 0) return '0';
  const size = Math.max(Math.abs(value), ticks.step);
  if (size >= 1e6 || ticks.decimals > 5) {
    const exponent = Math.floor(Math.log10(Math.abs(value)) + 1e-9);
    const mantissa = (value / 10 ** exponent).toPrecision(3).replace(/\.?0+$/, '');
    return `${mantissa}e${exponent}`.replaceAll('-', '−');
  }
  return value.toFixed(ticks.decimals).replace('-', '−');
}
