import { COLOURS, colourHex, SEQUENTIAL } from '@wakeloom/tracker/figures/colour-map';
import { niceStep } from '@wakeloom/tracker/figures/ticks';

/** Colours that speeds are drawn in: `colours[k]` for speeds from k / n to (k + 1) / n of `high`. */
export interface SpeedScale {
  readonly high: number;
  readonly colours: readonly string[];
}

/** Steps of colour: more cannot be told apart in thin lines. */
const STEPS = 32;

/** Share of samples that the scale must hold; the few faster ones take its last colour. */
const SHARE = 0.995;

/** Parts of the map that stand out from a light and from a dark page. */
const PART = { light: [0, 0.84], dark: [0.26, 1] } as const;

/** A scale from 0 to a round speed that holds nearly all samples. Sorts a copy: 0.1 s for a million. */
export function speedScale(speed: Float32Array, dark: boolean): SpeedScale {
  const sorted = speed.slice().sort();
  const fast = sorted.length === 0 ? 1 : sorted[Math.min(sorted.length - 1, Math.floor(SHARE * sorted.length))];
  const step = fast > 0 ? niceStep(fast / 10) : 0.1;
  const [from, to] = dark ? PART.dark : PART.light;
  const colours = Array.from({ length: STEPS }, (_, k) =>
    colourHex(SEQUENTIAL, Math.round((COLOURS - 1) * (from + ((to - from) * k) / (STEPS - 1)))),
  );
  return { high: Math.max(step, Math.ceil(fast / step) * step), colours };
}

/** Step of colour for a speed. */
export function speedStep(scale: SpeedScale, speed: number): number {
  const last = scale.colours.length - 1;
  return Math.max(0, Math.min(last, Math.floor((speed / scale.high) * scale.colours.length)));
}
