import { WakeloomError } from '../core/errors.js';
import type { Hdf5Reader } from '../core/hdf5.js';
import type { GridField, GridResult, GridShape } from '../eulerian/grid.js';

/** Names in grid.nc that are no fields. */
const NO_FIELDS = new Set(['x', 'y', 'z', 'edge', 'x_bounds', 'y_bounds', 'z_bounds', 'samples', 'pathlines']);

/** The grid as it was written, bit for bit. Code `store/not-a-result` when grid.nc lacks what a grid needs. */
export function readGrid(file: Hdf5Reader, where: string): GridResult {
  const shape = readShape(file, where);
  const bins = shape.count[0] * shape.count[1] * shape.count[2];
  const values = (name: string) => {
    const dataset = file.dataset(`/${name}`);
    if (dataset === null) throw damaged(where, name);
    return dataset.rows(0, dataset.shape[0]);
  };
  const fields = new Map<string, GridField>();
  for (const name of fieldNames(file)) {
    const dataset = file.dataset(`/${name}`);
    const data = values(name);
    if (dataset === null || data.length !== bins) throw damaged(where, name);
    const standardError = dataset.attribute('ancillary_variables');
    fields.set(name, {
      values: data instanceof Float32Array ? data : Float32Array.from(data),
      unit: String(dataset.attribute('units') ?? '1'),
      longName: String(dataset.attribute('long_name') ?? name),
      standardError: standardError === null ? null : String(standardError),
    });
  }
  return {
    shape,
    samples: Float64Array.from(values('samples')),
    pathlines: Float64Array.from(values('pathlines')),
    fields,
  };
}

/** Fields in the order of the file, which the attribute `fields` keeps. */
function fieldNames(file: Hdf5Reader): readonly string[] {
  const listed = file.attribute('fields');
  if (typeof listed === 'string') return listed.split(' ');
  return file
    .datasets()
    .map((path) => path.slice(1))
    .filter((name) => !NO_FIELDS.has(name));
}

function readShape(file: Hdf5Reader, where: string): GridShape {
  const three = (name: string): readonly [number, number, number] => {
    const value = file.attribute(name);
    if (!Array.isArray(value) || value.length !== 3) throw damaged(where, name);
    return [value[0], value[1], value[2]];
  };
  return {
    dims: file.dataset('/z') === null ? 2 : 3,
    count: three('bin_count'),
    first: three('first_bin_centre'),
    step: three('bin_step'),
    size: three('bin_size'),
  };
}

function damaged(where: string, name: string): WakeloomError {
  const message = `grid.nc: got no ${name} that fits, expected a whole grid (${where}); process the run again`;
  return new WakeloomError('store/not-a-result', message, { path: where, variable: name });
}
