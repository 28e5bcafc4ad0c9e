import type { Dims } from '../core/columns.js';
import { WakeloomError } from '../core/errors.js';
import { cubeRoot } from '../math/cube-root.js';
import type { GridSettings } from '../run/settings.js';
import type { GridShape } from './grid.js';

/** Smallest and largest coordinate of the samples per axis, length unit. */
export interface Bounds {
  readonly min: readonly [number, number, number];
  readonly max: readonly [number, number, number];
}

/**
 * Samples that a bin chosen automatically should hold over the run: several hundred make a shear stress, 50 to 100 a
 * rms (common practice, no source).
 */
export const SAMPLES_PER_BIN = 200;

/** Side of an automatic bin in mean particle spacings of one frame, at least: long runs would else get bins without end. */
const LEAST_SPACINGS = 0.5;

/** Side of an automatic bin as a share of the longest side of the field, at most: fewer bins than this show no flow. */
const MOST_SHARE = 1 / 12;

/** Bins that the arrays of an accumulator hold within about 1 GB in the plane, 2 GB in a volume. */
export const MOST_BINS = 4_000_000;

/** Steps of a decade that an automatic bin is rounded to, so that axes carry plain numbers. */
const ROUND_STEPS = [1, 1.2, 1.5, 2, 2.5, 3, 4, 5, 6, 8, 10];

/** How many standard deviations of the position noise the bounds of the samples are drawn in before bins are laid. */
const EDGE_NOISE = 5;

/**
 * Bounds drawn in by what noise can add to fitted positions (at most as uncertain as measured ones: 1 in 3.5 million
 * lies 5 standard deviations beyond its true place), and that distance per axis: the tolerance that a
 * grid laid on them must count samples with. Without it a field that ends at the border of a bin would get a rim of bins
 * with a handful of samples each. Axes too short for it, or without known noise, stay as they are.
 */
export function withoutNoise(
  bounds: Bounds,
  noise: readonly [number, number, number],
): { readonly bounds: Bounds; readonly tolerance: readonly [number, number, number] } {
  const margin = [0, 1, 2].map((axis) => {
    const wanted = EDGE_NOISE * noise[axis]!;
    return wanted > 0 && bounds.max[axis]! - bounds.min[axis]! > 4 * wanted ? wanted : 0;
  }) as [number, number, number];
  const moved = (values: Bounds['min'], sign: number) =>
    values.map((value, axis) => value + sign * margin[axis]!) as [number, number, number];
  // Twice: rounding must not leave the outermost sample outside.
  const tolerance = margin.map((value) => 2 * value) as [number, number, number];
  return { bounds: { min: moved(bounds.min, 1), max: moved(bounds.max, -1) }, tolerance };
}

/**
 * Bins that cover `bounds`. Without overlap a bin border lies on the origin of the results along every axis (centres
 * at half steps), so that grids of several runs with one bin size fit together and a grid of a symmetric setup is
 * symmetric. With overlap neighbouring centres lie size (1 - overlap) apart, at half steps from the origin too.
 *
 * `spacing`: mean particle spacing n^(-1/D) of one frame; `frames`: frames of the run. Both only matter for bins
 * chosen automatically: a bin of side b holds about frames (b / spacing)^D samples, b is chosen for 200 of them, not
 * below half a spacing, not above a twelfth of the longest side of the field, and rounded to a plain number.
 *
 * Throws `grid/no-extent` where there is no finite field, `grid/bin-size` for a size that is not positive, and
 * `grid/too-many-bins` above 4 million.
 */
export function gridShape(settings: GridSettings, dims: Dims, bounds: Bounds, spacing: number, frames = 1): GridShape {
  const axes = dims === 3 ? [0, 1, 2] : [0, 1];
  for (const axis of axes) {
    if (bounds.min[axis]! <= bounds.max[axis]! && Number.isFinite(bounds.max[axis]! - bounds.min[axis]!)) continue;
    throw new WakeloomError(
      'grid/no-extent',
      `grid: got a field from ${bounds.min[axis]} to ${bounds.max[axis]}, expected finite coordinates (${'xyz'[axis]} of the samples); no pathline may have been found`,
      { axis: 'xyz'[axis]!, min: String(bounds.min[axis]), max: String(bounds.max[axis]) },
    );
  }
  const bin = settings.bin === 'auto' ? automaticBin(dims, bounds, spacing, frames) : settings.bin;
  const first: [number, number, number] = [0, 0, 0];
  const step: [number, number, number] = [1, 1, 1];
  const size: [number, number, number] = [1, 1, 1];
  const count: [number, number, number] = [1, 1, 1];
  for (const axis of axes) {
    const side = bin[axis]!;
    if (!(side > 0 && Number.isFinite(side))) {
      throw new WakeloomError(
        'grid/bin-size',
        `bin size along ${'xyz'[axis]}: got ${side}, expected a positive length (run sheet: grid.bin)`,
        { axis: 'xyz'[axis]!, size: side },
      );
    }
    size[axis] = side;
    step[axis] = side * (1 - settings.overlap);
    const low = Math.floor(bounds.min[axis]! / step[axis]!);
    const high = Math.floor(bounds.max[axis]! / step[axis]!);
    first[axis] = (low + 0.5) * step[axis]!;
    count[axis] = high - low + 1;
  }
  const bins = count[0] * count[1] * count[2];
  if (!(bins <= MOST_BINS)) {
    throw new WakeloomError(
      'grid/too-many-bins',
      `grid: got ${count.slice(0, dims).join(' x ')} = ${bins} bins, expected at most ${MOST_BINS} (run sheet: grid.bin); choose larger bins or less overlap`,
      { bins, most: MOST_BINS },
    );
  }
  return { dims, count, first, step, size };
}

function automaticBin(dims: Dims, bounds: Bounds, spacing: number, frames: number): readonly [number, number, number] {
  let longest = 0;
  for (let axis = 0; axis < dims; axis++) longest = Math.max(longest, bounds.max[axis]! - bounds.min[axis]!);
  // A field without extent or spacing: one bin of any size will do.
  if (!(longest > 0)) return [1, 1, 1];
  const root = dims === 3 ? cubeRoot : Math.sqrt;
  const filled = spacing > 0 && Number.isFinite(spacing) ? spacing * root(SAMPLES_PER_BIN / Math.max(1, frames)) : 0;
  const least = spacing > 0 && Number.isFinite(spacing) ? spacing * LEAST_SPACINGS : 0;
  const wanted = Math.min(Math.max(filled, least), longest * MOST_SHARE);
  const side = roundLength(wanted > 0 ? wanted : longest * MOST_SHARE);
  return [side, side, side];
}

/** Nearest plain number at or above `length` (to a hair). */
function roundLength(length: number): number {
  let decade = 1;
  let up = 1;
  // Powers of ten as whole numbers and one division: exact to the last bit wherever they can be.
  while (length >= decade * 10) decade *= 10;
  while (length < decade / up) up *= 10;
  for (const step of ROUND_STEPS) {
    const plain = (step * decade) / up;
    if (plain >= length * (1 - 1e-9)) return plain;
  }
  return (10 * decade) / up;
}
