import { readFileSync } from 'node:fs';
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

type Eyes = 'all cones' | 'protan' | 'deutan' | 'tritan';

/**
 * What eyes without red, green or blue cones see of linear sRGB: Machado, Oliveira & Fernandes 2009 (IEEE Trans. Vis.
 * Comput. Graph. 15, 1291, doi:10.1109/TVCG.2009.113), matrices of severity 1.0, from memory. Rows sum to 1: greys stay.
 */
const SEEN: Readonly<Record<Eyes, readonly (readonly [number, number, number])[]>> = {
  'all cones': [
    [1, 0, 0],
    [0, 1, 0],
    [0, 0, 1],
  ],
  protan: [
    [0.152286, 1.052583, -0.204868],
    [0.114503, 0.786281, 0.099216],
    [-0.003882, -0.048116, 1.051998],
  ],
  deutan: [
    [0.367322, 0.860646, -0.227968],
    [0.280085, 0.672501, 0.047413],
    [-0.01182, 0.04294, 0.968881],
  ],
  tritan: [
    [1.255528, -0.076749, -0.178779],
    [-0.078411, 0.930809, 0.147602],
    [0.004733, 0.691367, 0.3039],
  ],
};
const ALL_EYES = ['all cones', 'protan', 'deutan', 'tritan'] as const;

function seenBy(eyes: Eyes, [r, g, b]: readonly [number, number, number]): [number, number, number] {
  const see = ([x, y, z]: readonly [number, number, number]) => Math.min(1, Math.max(0, x * r + y * g + z * b));
  const [first, second, third] = SEEN[eyes];
  return [see(first!), see(second!), see(third!)];
}

/** Linear sRGB to OKLab (Ottosson 2020): the inverse of what the maps are built with, in its published digits. */
function oklab([r, g, b]: readonly [number, number, number]): [number, number, number] {
  const l = Math.cbrt(0.4122214708 * r + 0.5363325363 * g + 0.0514459929 * b);
  const m = Math.cbrt(0.2119034982 * r + 0.6806995451 * g + 0.1073969566 * b);
  const s = Math.cbrt(0.0883024619 * r + 0.2817188376 * g + 0.6299787005 * b);
  return [
    0.2104542553 * l + 0.793617785 * m - 0.0040720468 * s,
    1.9779984951 * l - 2.428592205 * m + 0.4505937099 * s,
    0.0259040371 * l + 0.7827717662 * m - 0.808675766 * s,
  ];
}

/** Nine colours of each published map of a kind, in OKLab. */
function published(kind: 'sequential' | 'diverging'): { name: string; colours: [number, number, number][] }[] {
  const table = readFileSync(new URL('../../data/reference/published-colour-maps.csv', import.meta.url), 'utf8');
  return table
    .split('\n')
    .map((line) => line.split(','))
    .filter(([first]) => first === kind)
    .map(([, name, ...hex]) => ({
      name: name!,
      colours: hex.map((text) => oklab(linearOf(Uint8Array.from(Buffer.from(text, 'hex')), 0))),
    }));
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
  it.each(ALL_EYES)('rises in lightness from entry to entry for eyes with %s', (eyes) => {
    const lightness = all.map((i) => cielab(seenBy(eyes, linearOf(SEQUENTIAL, i)))[0]);
    // Bytes round by up to half a step, so neighbours may tie; four entries apart must not.
    for (let i = 4; i < COLOURS; i++) expect(lightness[i]!).toBeGreaterThan(lightness[i - 4]!);
    expect(lightness[COLOURS - 1]! - lightness[0]!).toBeGreaterThan(70);
  });

  it('has steps that differ by less than a factor of 2.5 in CIELAB too', () => {
    const steps = Array.from({ length: 15 }, (_, i) =>
      distance(cielab(linearOf(SEQUENTIAL, i * 16)), cielab(linearOf(SEQUENTIAL, (i + 1) * 16))),
    );
    expect(Math.max(...steps) / Math.min(...steps)).toBeLessThan(2.5);
  });

  // A difference of 2.3 in CIELAB is just noticed (Mahy, Van Eycken & Oosterlinck 1994, from memory).
  it.each(ALL_EYES)('keeps sixteenths of the range noticeably apart for eyes with %s', (eyes) => {
    const seen = (i: number) => cielab(seenBy(eyes, linearOf(SEQUENTIAL, i)));
    for (let i = 0; i + 16 < COLOURS; i++) expect(distance(seen(i), seen(i + 16))).toBeGreaterThan(2.3);
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

  it.each(ALL_EYES)('keeps equal values of both signs apart for eyes with %s', (eyes) => {
    const seen = (i: number) => cielab(seenBy(eyes, linearOf(DIVERGING, i)));
    const apart = (share: number) => {
      const step = Math.round(share * 127);
      return distance(seen(127 - step), seen(127 + step));
    };
    // Three times what is just noticed at an eighth of the range; unmistakable from half of it on.
    expect(apart(1 / 8)).toBeGreaterThan(3 * 2.3);
    for (const share of [0.5, 0.75, 1]) expect(apart(share)).toBeGreaterThan(30);
  });
});

describe('both maps', () => {
  // 0.02 in OKLab is about just noticed (from memory). Mean over nine places, in either direction of the other map.
  it.each([
    ['sequential', SEQUENTIAL, 17],
    ['diverging', DIVERGING, 11],
  ] as const)('%s: look like no published map in wide use', (kind, map, count) => {
    const maps = published(kind);
    expect(maps).toHaveLength(count);
    const own = Array.from({ length: 9 }, (_, i) => oklab(linearOf(map, Math.round((i * (COLOURS - 1)) / 8))));
    const mean = (colours: readonly (readonly number[])[]) =>
      own.reduce((sum, colour, i) => sum + distance(colour, colours[i]!) / 9, 0);
    for (const { name, colours } of maps) {
      const nearest = Math.min(mean(colours), mean([...colours].reverse()));
      expect({ name, apart: nearest > 0.07, nearest }).toMatchObject({ name, apart: true });
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
