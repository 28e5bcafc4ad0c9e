import {
  COLOURS,
  type ColourMap,
  colourHex,
  colourIndex,
  DIVERGING,
  divergingLab,
  oklabToLinear,
  SEQUENTIAL,
  sequentialLab,
} from '@wakeloom/tracker/figures/colour-map';
import { describe, expect, it } from 'vitest';

/** Linear sRGB of an entry (IEC 61966-2-1). */
function linearOf(map: ColourMap, index: number): [number, number, number] {
  const channel = (at: number) => {
    const c = (map[3 * index + at] ?? Number.NaN) / 255;
    return c <= 0.04045 ? c / 12.92 : ((c + 0.055) / 1.055) ** 2.4;
  };
  return [channel(0), channel(1), channel(2)];
}

/** CIELAB (D65, 2 degrees), an independent measure of what the maps were built in OKLab for. CIE 15. */
function cielab([r, g, b]: readonly [number, number, number]): [number, number, number] {
  const x = (0.4124564 * r + 0.3575761 * g + 0.1804375 * b) / 0.95047;
  const y = 0.2126729 * r + 0.7151522 * g + 0.072175 * b;
  const z = (0.0193339 * r + 0.119192 * g + 0.9503041 * b) / 1.08883;
  const f = (t: number) => (t > 216 / 24389 ? Math.cbrt(t) : ((24389 / 27) * t + 16) / 116);
  return [116 * f(y) - 16, 500 * (f(x) - f(y)), 200 * (f(y) - f(z))];
}

/**
 * What someone without red or green cones sees: Vienot, Brettel & Mollon 1999 (Color Res. Appl. 24, 243), matrices
 * from memory, applied to linear light.
 */
function deficient(kind: 'protan' | 'deutan', [r, g, b]: readonly [number, number, number]): [number, number, number] {
  const l = 17.8824 * r + 43.5161 * g + 4.11935 * b;
  const m = 3.45565 * r + 27.1554 * g + 3.86714 * b;
  const s = 0.0299566 * r + 0.184309 * g + 1.46709 * b;
  const [l2, m2] = kind === 'protan' ? [2.02344 * m - 2.52581 * s, m] : [l, 0.494207 * l + 1.24827 * s];
  return [
    0.0809444479 * l2 - 0.130504409 * m2 + 0.116721066 * s,
    -0.0102485335 * l2 + 0.0540193266 * m2 - 0.113614708 * s,
    -0.000365296938 * l2 - 0.00412161469 * m2 + 0.693511405 * s,
  ];
}

const distance = (a: readonly number[], b: readonly number[]) => Math.hypot(...a.map((value, i) => value - b[i]!));
const all = Array.from({ length: COLOURS }, (_, i) => i);

describe.each([
  ['sequential', SEQUENTIAL, sequentialLab()],
  ['diverging', DIVERGING, divergingLab()],
] as const)('%s colour map', (_name, map, lab) => {
  it('lies inside the sRGB gamut, so that no entry is clipped', () => {
    for (const colour of lab) {
      for (const channel of oklabToLinear(colour)) {
        expect(channel).toBeGreaterThanOrEqual(0);
        expect(channel).toBeLessThanOrEqual(1);
      }
    }
  });

  it('walks in equal OKLab steps (1 % over the whole map)', () => {
    const steps = lab.slice(1).map((colour, i) => distance(colour, lab[i]!));
    // The two arms of the diverging map differ in length: each is even in itself.
    for (const arm of map === SEQUENTIAL ? [steps] : [steps.slice(0, 127), steps.slice(127)]) {
      const mean = arm.reduce((a, b) => a + b, 0) / arm.length;
      for (const step of arm) expect(Math.abs(step / mean - 1)).toBeLessThan(0.01);
    }
  });
});

describe('sequential map in CIELAB, from its bytes', () => {
  it('rises in lightness from entry to entry, also for protan and deutan eyes', () => {
    for (const seen of [
      (c: [number, number, number]) => c,
      (c: [number, number, number]) => deficient('protan', c),
      (c: [number, number, number]) => deficient('deutan', c),
    ]) {
      const lightness = all.map((i) => cielab(seen(linearOf(SEQUENTIAL, i)))[0]);
      // Bytes round by up to half a step, so neighbours may tie; four entries apart must not.
      for (let i = 4; i < COLOURS; i++) expect(lightness[i]!).toBeGreaterThan(lightness[i - 4]!);
      expect(lightness[COLOURS - 1]! - lightness[0]!).toBeGreaterThan(75);
    }
  });

  it('has steps that differ by less than a factor of 2.5 in CIELAB too', () => {
    const steps = Array.from({ length: 15 }, (_, i) =>
      distance(cielab(linearOf(SEQUENTIAL, i * 16)), cielab(linearOf(SEQUENTIAL, (i + 1) * 16))),
    );
    expect(Math.max(...steps) / Math.min(...steps)).toBeLessThan(2.5);
  });
});

describe('diverging map in CIELAB, from its bytes', () => {
  const lightness = all.map((i) => cielab(linearOf(DIVERGING, i))[0]);

  it('is lightest in the middle, darkens strictly to both ends and is even on both sides', () => {
    for (let i = 4; i <= 127; i++) {
      expect(lightness[i]!).toBeGreaterThan(lightness[i - 4]!);
      expect(lightness[COLOURS - 1 - i]!).toBeGreaterThan(lightness[COLOURS - 1 - i + 4]!);
    }
    for (let i = 0; i < 127; i++) expect(Math.abs(lightness[i]! - lightness[COLOURS - 1 - i]!)).toBeLessThan(6);
    const [, a, b] = cielab(linearOf(DIVERGING, 127));
    expect(Math.hypot(a, b)).toBeLessThan(3);
  });

  it('keeps its two ends apart for protan and deutan eyes', () => {
    for (const kind of ['protan', 'deutan'] as const) {
      const ends = [20, COLOURS - 21].map((i) => cielab(deficient(kind, linearOf(DIVERGING, i))));
      expect(distance(ends[0]!, ends[1]!)).toBeGreaterThan(50);
    }
  });
});

describe('colourIndex', () => {
  it('spreads a range over all entries and puts what lies beyond into the end colours', () => {
    expect(colourIndex(0, 0, 10)).toBe(0);
    expect(colourIndex(10, 0, 10)).toBe(COLOURS - 1);
    expect(colourIndex(5, 0, 10)).toBe(127);
    expect(colourIndex(-3, 0, 10)).toBe(0);
    expect(colourIndex(99, 0, 10)).toBe(COLOURS - 1);
    expect(colourIndex(Number.NaN, 0, 10)).toBe(-1);
    expect(colourIndex(4, 4, 4)).toBe(127);
  });

  it('names an entry in hex', () => {
    expect(colourHex(Uint8Array.of(1, 2, 3, 250, 0, 16), 1)).toBe('#fa0010');
  });
});
