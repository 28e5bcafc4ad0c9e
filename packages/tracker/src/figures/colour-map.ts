/**
 * Two colour maps of our own, built in OKLab (B. Ottosson 2020, "A perceptual color space for image processing"):
 * smooth paths through a few anchor colours, walked in steps of equal OKLab distance, so that equal differences of
 * the value look equally large. Lightness rises strictly along the sequential map and falls strictly from the middle
 * of the diverging one to both ends: the order is kept in grey prints and for eyes without red, green or blue cones.
 * The two arms of the diverging map lie on both sides of what such eyes confuse, so that signs stay apart.
 */

/** Entries of a colour map: odd, so that a diverging map has a middle; 255, so that a byte holds them and "empty". */
export const COLOURS = 255;

/** sRGB bytes, three an entry, `COLOURS` entries. Shared: do not write into it. */
export type ColourMap = Uint8Array;

/** Anchor colour: OKLab lightness 0..1, chroma, hue in degrees. */
type Anchor = readonly [lightness: number, chroma: number, hue: number];

/** Bottle green over slate, mauve and old rose to sand. */
const HEATH: readonly Anchor[] = [
  [0.25, 0.043, 165],
  [0.42, 0.068, 225],
  [0.59, 0.095, 288],
  [0.76, 0.088, 8],
  [0.94, 0.05, 80],
];

/** Indigo over almost white to bronze; both arms have the same lightness at the same distance from the middle. */
const TWO_WAYS: readonly Anchor[] = [
  [0.39, 0.13, 285],
  [0.67, 0.11, 280],
  [0.96, 0.006, 90],
  [0.67, 0.1, 85],
  [0.39, 0.078, 75],
];

type Lab = readonly [number, number, number];

function toLab([lightness, chroma, hue]: Anchor): Lab {
  const angle = (hue * Math.PI) / 180;
  return [lightness, chroma * Math.cos(angle), chroma * Math.sin(angle)];
}

/** OKLab to linear sRGB, Ottosson's matrices; values outside 0..1 are outside the gamut. */
export function oklabToLinear([lightness, a, b]: Lab): [number, number, number] {
  const l = (lightness + 0.3963377774 * a + 0.2158037573 * b) ** 3;
  const m = (lightness - 0.1055613458 * a - 0.0638541728 * b) ** 3;
  const s = (lightness - 0.0894841775 * a - 1.291485548 * b) ** 3;
  return [
    4.0767416621 * l - 3.3077115913 * m + 0.2309699292 * s,
    -1.2684380046 * l + 2.6097574011 * m - 0.3413193965 * s,
    -0.0041960863 * l - 0.7034186147 * m + 1.707614701 * s,
  ];
}

/** Linear light 0..1 to an sRGB byte (IEC 61966-2-1). */
function toByte(linear: number): number {
  const light = Math.min(1, Math.max(0, linear));
  return Math.round(255 * (light <= 0.0031308 ? 12.92 * light : 1.055 * light ** (1 / 2.4) - 0.055));
}

/** Catmull-Rom curve through the anchors (ends mirrored), `position` in anchors from 0. */
function alongAnchors(anchors: readonly Lab[], position: number): Lab {
  const last = anchors.length - 1;
  const cell = Math.min(last - 1, Math.max(0, Math.floor(position)));
  const t = position - cell;
  const at = (index: number, axis: 0 | 1 | 2): number => {
    if (index < 0) return 2 * anchors[0]![axis] - anchors[-index]![axis];
    if (index > last) return 2 * anchors[last]![axis] - anchors[2 * last - index]![axis];
    return anchors[index]![axis];
  };
  const mix = (axis: 0 | 1 | 2): number => {
    const [p, q, r, s] = [at(cell - 1, axis), at(cell, axis), at(cell + 1, axis), at(cell + 2, axis)];
    return q + 0.5 * t * (r - p + t * (2 * p - 5 * q + 4 * r - s + t * (3 * (q - r) + s - p)));
  };
  return [mix(0), mix(1), mix(2)];
}

/** Colours at equal OKLab distances along the path between two anchor positions. [steps x Lab] */
function equalSteps(anchors: readonly Lab[], from: number, to: number, steps: number): Lab[] {
  // 4000 chords a path: their sum is within 1e-6 of the arc, far below one step of 255.
  const fine = 4000;
  const length = new Float64Array(fine + 1);
  let before = alongAnchors(anchors, from);
  for (let i = 1; i <= fine; i++) {
    const here = alongAnchors(anchors, from + ((to - from) * i) / fine);
    length[i] = length[i - 1]! + Math.hypot(here[0] - before[0], here[1] - before[1], here[2] - before[2]);
    before = here;
  }
  const colours: Lab[] = [];
  let i = 0;
  for (let step = 0; step < steps; step++) {
    const wanted = (length[fine]! * step) / (steps - 1);
    while (i < fine - 1 && length[i + 1]! < wanted) i++;
    const share = (wanted - length[i]!) / (length[i + 1]! - length[i]!);
    colours.push(alongAnchors(anchors, from + ((to - from) * (i + share)) / fine));
  }
  return colours;
}

/** OKLab colours of the map for values from the lowest to the highest. New array of `COLOURS`. */
export function sequentialLab(): Lab[] {
  return equalSteps(HEATH.map(toLab), 0, HEATH.length - 1, COLOURS);
}

/** OKLab colours of the map for values on both sides of zero; entry 127 is the middle. */
export function divergingLab(): Lab[] {
  const anchors = TWO_WAYS.map(toLab);
  const arm = (COLOURS + 1) / 2;
  return [...equalSteps(anchors, 0, 2, arm), ...equalSteps(anchors, 2, 4, arm).slice(1)];
}

function toBytes(colours: readonly Lab[]): ColourMap {
  const bytes = new Uint8Array(3 * colours.length);
  colours.forEach((lab, i) => {
    bytes.set(oklabToLinear(lab).map(toByte), 3 * i);
  });
  return bytes;
}

/** For quantities that run from low to high: speed, samples per bin. Dark is low. */
export const SEQUENTIAL: ColourMap = toBytes(sequentialLab());

/** For signed quantities: indigo is negative, bronze positive, almost white zero. */
export const DIVERGING: ColourMap = toBytes(divergingLab());

/** Entry of the map for a value between `low` and `high`, 0..COLOURS - 1; values beyond take the end colour. NaN gives -1. */
export function colourIndex(value: number, low: number, high: number): number {
  if (Number.isNaN(value)) return -1;
  if (!(high > low)) return COLOURS >> 1;
  return Math.min(COLOURS - 1, Math.max(0, Math.floor(((value - low) / (high - low)) * COLOURS)));
}

/** `#rrggbb` of an entry. */
export function colourHex(map: ColourMap, index: number): string {
  const hex = (byte: number | undefined) => (byte ?? 0).toString(16).padStart(2, '0');
  return `#${hex(map[3 * index])}${hex(map[3 * index + 1])}${hex(map[3 * index + 2])}`;
}
