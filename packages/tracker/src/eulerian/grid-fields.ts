import { studentFactor, varianceFactor } from '../math/student.js';
import type { BinLayout } from './bin-layout.js';
import type { GridField, GridResult, GridShape } from './grid.js';
import type { BinMoments } from './moments.js';
import { momentsOf } from './moments.js';

/** What the grid needs to know besides its shape. */
export interface GridOptions {
  /** Fewest samples of a bin for a mean, for a stress (at least 2). */
  readonly fewestForMean: number;
  readonly fewestForStress: number;
  /** Names of the length and the time unit: `mm`, `s`. */
  readonly lengthUnit: string;
  readonly timeUnit: string;
  /**
   * How far beyond the border of the grid a sample still counts, in the bins at the border, length unit per axis:
   * the noise of fitted positions must not push samples out of the field. Absent: not at all.
   */
  readonly tolerance?: readonly [number, number, number];
}

/** Fewest different pathlines for the standard error of a mean: two leave one degree of freedom, whose intervals say nothing. */
export const FEWEST_PATHLINES_FOR_SE = 3;

/** Fewest different pathlines for a stress: of nine degrees of freedom it is good to sqrt(2 / 9), about half of itself. */
export const FEWEST_PATHLINES_FOR_STRESS = 10;

/** Pathlines that the normal distribution weighs in the standard error of a stress, against those of the bin. */
const NORMAL_WEIGHT = 20;

const COMPONENTS = ['u', 'v', 'w'] as const;

/**
 * Turns the sums of all bins into named fields. Bins with fewer samples than asked for are NaN, never filled, and so are
 * standard errors of means from fewer than 3 different pathlines and stresses from fewer than 10: samples of one
 * pathline tell the same story. Standard errors are widened for few pathlines so that 1.96 of them cover 95 %
 * (`studentFactor`, `varianceFactor`).
 * Normal stresses are given raw and less the mean squared standard error of the velocity (the part that position noise
 * adds, independent of the flow; it may leave a small negative value, which stays). Shear stresses have no such part,
 * since the noise of different axes is independent: there both are equal.
 */
export function gridFields(shape: GridShape, layout: BinLayout, sums: Float64Array, options: GridOptions): GridResult {
  const bins = shape.count[0] * shape.count[1] * shape.count[2];
  const { dims, pairs } = layout;
  const samples = new Float64Array(bins);
  const pathlines = new Float64Array(bins);
  const columns = (count: number) => Array.from({ length: count }, () => new Float32Array(bins).fill(Number.NaN));
  const mean = columns(dims);
  const meanSe = columns(dims);
  const stress = columns(pairs.length);
  const stressSe = columns(pairs.length);
  const raw = columns(pairs.length);
  for (let bin = 0; bin < bins; bin++) {
    const n = sums[bin * layout.stride + layout.samples]!;
    samples[bin] = n;
    pathlines[bin] = sums[bin * layout.stride + layout.pathlines]!;
    if (n === 0 || (n < options.fewestForMean && n < options.fewestForStress)) continue;
    const moments = momentsOf(layout, sums, bin);
    if (n >= options.fewestForMean) {
      const widened = studentFactor(moments.effectivePathlines - 1);
      for (let a = 0; a < dims; a++) {
        mean[a]![bin] = moments.mean[a]!;
        if (moments.pathlines >= FEWEST_PATHLINES_FOR_SE) meanSe[a]![bin] = moments.meanSe[a]! * widened;
      }
    }
    if (n >= options.fewestForStress && moments.pathlines >= FEWEST_PATHLINES_FOR_STRESS) {
      for (let k = 0; k < pairs.length; k++) {
        const [a, b] = pairs[k]!;
        raw[k]![bin] = moments.product[k]!;
        stress[k]![bin] = moments.product[k]! - (a === b ? moments.noise[a]! : 0);
        stressSe[k]![bin] = stressError(moments, k);
      }
    }
  }
  const speed = `${options.lengthUnit}/${options.timeUnit}`;
  const square = `${options.lengthUnit}2/${options.timeUnit}2`;
  const fields = new Map<string, GridField>();
  for (let a = 0; a < dims; a++) {
    const name = COMPONENTS[a]!;
    const along = 'xyz'[a]!;
    fields.set(name, field(mean[a]!, speed, `mean velocity along ${along}`, `${name}_se`));
  }
  for (let a = 0; a < dims; a++) {
    const name = COMPONENTS[a]!;
    fields.set(
      `${name}_se`,
      field(meanSe[a]!, speed, `standard error of mean velocity along ${'xyz'[a]!}, 1.96 of it cover 95 %`, null),
    );
  }
  const names = pairs.map(([a, b]) => `${COMPONENTS[a]!}${COMPONENTS[b]!}`);
  const what = (name: string) => `kinematic Reynolds stress, mean of ${name[0]}' ${name[1]}'`;
  for (const [k, name] of names.entries()) {
    fields.set(name, field(stress[k]!, square, `${what(name)}, less the part of position noise`, `${name}_se`));
  }
  for (const [k, name] of names.entries()) {
    fields.set(
      `${name}_se`,
      field(stressSe[k]!, square, `standard error of the ${what(name)}, 1.96 of it cover 95 %`, null),
    );
  }
  for (const [k, name] of names.entries()) {
    fields.set(`${name}_raw`, field(raw[k]!, square, `${what(name)}, position noise included`, `${name}_se`));
  }
  return { shape, samples, pathlines, fields };
}

/**
 * Standard error of stress k. The one that the products themselves tell is a fourth moment, of which few pathlines know
 * little; it leans on what a normal distribution would give, (uu vv + uv^2) / freedom, as if by 20 pathlines more.
 */
function stressError({ pairs, product, productSe, effectivePathlines }: BinMoments, k: number): number {
  const [a, b] = pairs[k]!;
  const along = (axis: number) => product[pairs.findIndex(([i, j]) => i === axis && j === axis)]!;
  const freedom = effectivePathlines > 3 ? effectivePathlines - 1 : 2;
  const normal = (along(a) * along(b) + product[k]! * product[k]!) / freedom;
  // Of normal variables the fourth moment of G comes out too small by (G - 1) (G - 2) / G^2.
  const g = effectivePathlines > 3 ? effectivePathlines : 3;
  const own = (productSe[k]! * productSe[k]! * g * g) / ((g - 1) * (g - 2));
  const square = (g * own + NORMAL_WEIGHT * normal) / (g + NORMAL_WEIGHT);
  return Math.sqrt(square) * varianceFactor(freedom);
}

function field(values: Float32Array, unit: string, longName: string, standardError: string | null): GridField {
  return { values, unit, longName, standardError };
}
