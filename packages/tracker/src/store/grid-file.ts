import type { RunContext } from '../core/context.js';
import type { NumericArray } from '../core/hdf5.js';
import type { ResultPlace } from '../core/result-place.js';
import type { GridResult, GridShape } from '../eulerian/grid.js';
import type { AttributeValue } from './digest.js';
import { fileAttributes, type ResultUnits } from './file-attributes.js';
import { type Attributes, createNetcdf } from './netcdf-writer.js';

const AXES = ['x', 'y', 'z'] as const;

/**
 * Writes grid.nc: coordinates with bounds, `samples`, `pathlines`, and every field with unit, long name and the name
 * of its standard error. Dimensions (z, )y, x: x fastest. Empty bins are NaN (`_FillValue`). Resolves to the digest.
 */
export async function writeGridFile(
  place: ResultPlace,
  grid: GridResult,
  units: ResultUnits,
  title: string,
  attributes: Attributes,
  context: RunContext,
): Promise<string> {
  const { shape } = grid;
  const own = { ...shapeAttributes(shape), ...fieldList(grid), ...attributes };
  const file = await createNetcdf(place, 'grid.nc', fileAttributes(title, null, own));
  try {
    const axes = AXES.slice(0, shape.dims);
    axes.forEach((axis, index) => {
      file.dimension(axis, shape.count[index]);
    });
    file.dimension('edge', 2);
    const values = new Map<string, () => NumericArray>();
    axes.forEach((axis, index) => {
      const coordinate = { long_name: `${axis} of the bin centre`, units: units.length, axis: axis.toUpperCase() };
      file.variable({
        name: axis,
        type: 'f64',
        dimensions: [axis],
        attributes: { ...coordinate, bounds: `${axis}_bounds` },
      });
      values.set(axis, () => centres(shape, index));
      file.variable({ name: `${axis}_bounds`, type: 'f64', dimensions: [axis, 'edge'], attributes: {} });
      values.set(`${axis}_bounds`, () => bounds(shape, index));
    });
    const dimensions = [...axes].reverse();
    const count = (name: string, longName: string, counts: Float64Array) => {
      file.variable({ name, type: 'i32', dimensions, attributes: { long_name: longName, units: '1' } });
      values.set(name, () => Int32Array.from(counts));
    };
    count('samples', 'samples in the bin', grid.samples);
    count('pathlines', 'distinct pathlines with samples in the bin', grid.pathlines);
    for (const [name, field] of grid.fields) {
      const own: Record<string, AttributeValue> = {
        long_name: field.longName,
        units: field.unit === '' ? '1' : field.unit,
      };
      if (field.standardError !== null) own['ancillary_variables'] = field.standardError;
      own['_FillValue'] = { type: 'f32', values: [Number.NaN] };
      file.variable({ name, type: 'f32', dimensions, attributes: own });
      values.set(name, () => field.values);
    }
    for (const [name, make] of values) {
      await file.append(name, make());
      await context.breathe();
    }
    return await file.finish(context);
  } catch (error) {
    file.abandon();
    throw error;
  }
}

/** The shape as numbers, since differences of coordinates do not give it back to the last bit. */
function shapeAttributes({ count, first, step, size }: GridShape): Attributes {
  return {
    bin_count: { type: 'i32', values: count },
    first_bin_centre: { type: 'f64', values: first },
    bin_step: { type: 'f64', values: step },
    bin_size: { type: 'f64', values: size },
  };
}

/** Names of the fields in their order; none: no attribute, since HDF5 has no empty text. */
function fieldList(grid: GridResult): Attributes {
  return grid.fields.size === 0 ? {} : { fields: [...grid.fields.keys()].join(' ') };
}

/** Bin centres along an axis. */
export function centres(shape: GridShape, axis: number): Float64Array {
  return Float64Array.from({ length: shape.count[axis] }, (_, i) => shape.first[axis] + i * shape.step[axis]);
}

function bounds(shape: GridShape, axis: number): Float64Array {
  const half = shape.size[axis] / 2;
  const middle = centres(shape, axis);
  return Float64Array.from({ length: 2 * middle.length }, (_, i) => middle[i >> 1] + (i % 2 === 0 ? -half : half));
}
