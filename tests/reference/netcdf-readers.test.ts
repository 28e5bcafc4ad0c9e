import { execFileSync } from 'node:child_process';
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { FLAG } from '@wakeloom/tracker';
import type { Dims } from '@wakeloom/tracker/core/columns';
import { openNodeResultPlace } from '@wakeloom/tracker/node/result-place-node';
import { sampleColumns } from '@wakeloom/tracker/store/sample-columns';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { MADE_OPTIONS, madeGrid, makeResult } from '../helpers/made-result.js';
import { needs } from '../helpers/need.js';
import { sampleOracle } from '../helpers/sample-oracle.js';

interface SeenVariable {
  dtype: string;
  dimensions: string[];
  attributes: Record<string, unknown>;
  values: number[];
}
interface Seen {
  netcdf: Record<
    string,
    {
      model: string;
      dimensions: Record<string, number>;
      unlimited: string[];
      attributes: Record<string, unknown>;
      variables: Record<string, SeenVariable>;
    }
  >;
  h5py: Record<string, Record<string, { chunks: number[]; values: number[] }>>;
  ragged: { contiguous: number[]; indexed: number[] };
  writable: Record<string, string>;
}

const python = needs('python3-netcdf4') && needs('python3-h5py');
/** NaN as the script prints it. */
const printed = (values: readonly number[]) => values.map((value) => (Number.isNaN(value) ? null : value));

describe.each([2, 3] as Dims[])('readers not written by us, %i dimensions', (dims) => {
  const made = { dims, frames: 40, particles: 300, life: 14 };
  const oracle = sampleOracle(made, MADE_OPTIONS);
  let folder: string;
  let seen: Seen;

  beforeAll(async () => {
    folder = mkdtempSync(join(tmpdir(), 'netcdf-readers-'));
    await makeResult(await openNodeResultPlace(folder, { create: true }), made);
    if (!python) return;
    const script = join(import.meta.dirname, '../helpers/read-netcdf.py');
    const output = execFileSync('/usr/bin/python3', [script, folder], { encoding: 'utf8', maxBuffer: 2 ** 28 });
    seen = JSON.parse(output) as Seen;
  });
  afterAll(() => rmSync(folder, { recursive: true, force: true }));

  it.skipIf(!python)('netCDF4 sees pathlines as a CF contiguous ragged array with all values', () => {
    const file = seen.netcdf['pathlines.nc'];
    expect(file.model).toBe('NETCDF4');
    expect(file.attributes).toMatchObject({ Conventions: 'CF-1.11', featureType: 'trajectory' });
    expect(file.attributes).not.toHaveProperty('history');
    expect(file.dimensions).toEqual({ pathline: oracle.rowSize.length, sample: oracle.samples });
    expect(file.unlimited).toEqual([]);
    expect(file.variables['pathline'].attributes['cf_role']).toBe('trajectory_id');
    expect(file.variables['row_size'].attributes['sample_dimension']).toBe('sample');
    expect(file.variables['row_size'].values).toEqual(oracle.rowSize);
    const firstFrames: number[] = [];
    const lastFrames: number[] = [];
    let row = 0;
    for (const size of oracle.rowSize) {
      firstFrames.push(oracle.columns['frame'][row]);
      row += size;
      lastFrames.push(oracle.columns['frame'][row - 1]);
    }
    expect(file.variables['first_frame'].values).toEqual(firstFrames);
    expect(file.variables['last_frame'].values).toEqual(lastFrames);
    for (const column of sampleColumns(dims, false)) {
      const variable = file.variables[column.name];
      expect(variable.dimensions, column.name).toEqual(['sample']);
      expect(variable.values, column.name).toEqual(printed(oracle.columns[column.key]));
    }
  });

  it.skipIf(!python)('netCDF4 sees units, types, errors and flag meanings', () => {
    const { variables } = seen.netcdf['pathlines.nc'];
    const units = Object.fromEntries(
      Object.entries(variables).map(([name, { attributes }]) => [name, attributes['units']]),
    );
    expect(units).toMatchObject({
      time: 's',
      x: 'mm',
      u: 'mm/s',
      ax: 'mm/s2',
      x_se: 'mm',
      u_se: 'mm/s',
      ax_se: 'mm/s2',
    });
    expect(units).toMatchObject({ y: 'mm', v: 'mm/s', ay: 'mm/s2', measured_x: 'mm', link_risk: '1' });
    if (dims === 3) expect(units).toMatchObject({ z: 'mm', w: 'mm/s', az: 'mm/s2', w_se: 'mm/s' });
    expect(variables['time'].attributes).not.toHaveProperty('standard_name');
    const types = Object.fromEntries(Object.entries(variables).map(([name, { dtype }]) => [name, dtype]));
    expect(types).toMatchObject({
      time: 'float64',
      x: 'float64',
      measured_y: 'float64',
      u: 'float32',
      u_se: 'float32',
    });
    expect(types).toMatchObject({ detection: 'int64', flags: 'uint16', frame: 'int32', link_risk: 'float32' });
    for (const name of ['x', 'y', 'u', 'v', 'ax', 'ay']) {
      expect(variables[name].attributes['ancillary_variables']).toBe(`${name}_se`);
      expect(variables).toHaveProperty(`${name}_se`);
    }
    for (const file of ['pathlines.nc', 'frames.nc']) {
      const { attributes } = seen.netcdf[file].variables['flags'];
      const meanings = String(attributes['flag_meanings']).split(' ');
      expect(Object.fromEntries(meanings.map((name, i) => [name, (attributes['flag_masks'] as number[])[i]]))).toEqual(
        FLAG,
      );
    }
    for (const [name, { attributes }] of Object.entries(variables)) {
      expect(String(attributes['long_name']).length, name).toBeGreaterThan(3);
    }
  });

  it.skipIf(!python)('netCDF4 sees frames as a CF indexed ragged array that agrees with pathlines', () => {
    const file = seen.netcdf['frames.nc'];
    const { variables } = file;
    expect(file.attributes).toMatchObject({ Conventions: 'CF-1.11', featureType: 'trajectory' });
    expect(variables['pathline_index'].attributes['instance_dimension']).toBe('pathline');
    expect(file.dimensions).toMatchObject({
      frame: made.frames,
      sample: oracle.samples,
      pathline: oracle.rowSize.length,
    });
    const sizes = variables['row_size'].values;
    expect(sizes.reduce((sum, size) => sum + size, 0)).toBe(oracle.samples);
    let first = 0;
    for (let frame = 0; frame < made.frames; frame++) {
      expect(variables['first_row'].values[frame]).toBe(first);
      for (let row = first; row < first + sizes[frame]; row++) {
        const there = variables['pathlines_row'].values[row];
        expect(oracle.columns['frame'][there]).toBe(variables['frame'].values[frame]);
        expect(oracle.columns['time'][there]).toBe(variables['time'].values[frame]);
        expect(variables['sample_time'].values[row]).toBe(variables['time'].values[frame]);
        expect(oracle.columns['x'][there]).toBe(variables['x'].values[row]);
        expect(oracle.columns['flags'][there]).toBe(variables['flags'].values[row]);
      }
      first += sizes[frame];
    }
    expect(seen.ragged.indexed.length).toBe(oracle.rowSize.length);
    seen.ragged.indexed.forEach((sum, k) => {
      expect(sum).toBeCloseTo(seen.ragged.contiguous[k], 6);
    });
  });

  it.skipIf(!python)('netCDF4 finds time and place of every sample variable among its coordinates, as CF asks', () => {
    for (const name of ['pathlines.nc', 'frames.nc']) {
      const { variables } = seen.netcdf[name];
      const time = name === 'frames.nc' ? 'sample_time' : 'time';
      const wanted = [time, 'x', 'y', ...(dims === 3 ? ['z'] : [])].sort();
      for (const key of ['u', 'v', 'flags']) {
        const { attributes, dimensions } = variables[key];
        const named = String(attributes['coordinates']).split(' ');
        expect([...named].sort(), `${name} ${key}`).toEqual(wanted);
        // A coordinate spans no dimension that the variable has not (CF conventions, chapter 5).
        for (const each of named) expect(dimensions, `${name} ${each}`).toEqual(variables[each].dimensions);
      }
      expect(variables[time].attributes['units']).toBe('s');
    }
  });

  it.skipIf(!python)('netCDF4 sees the grid with coordinates, bounds, fields and empty bins', () => {
    const grid = madeGrid(dims);
    const { shape } = grid;
    const file = seen.netcdf['grid.nc'];
    const axes = ['x', 'y', 'z'].slice(0, dims);
    axes.forEach((axis, i) => {
      const centres = Array.from({ length: shape.count[i] }, (_, k) => shape.first[i] + k * shape.step[i]);
      const { attributes, values } = file.variables[axis];
      expect(values).toEqual(centres);
      expect(attributes).toMatchObject({ units: 'mm', axis: axis.toUpperCase(), bounds: `${axis}_bounds` });
      const half = shape.size[i] / 2;
      expect(file.variables[`${axis}_bounds`].values).toEqual(centres.map((centre) => [centre - half, centre + half]));
    });
    const flat = (name: string) => file.variables[name].values.flat(2) as (number | null)[];
    expect(flat('samples')).toEqual([...grid.samples]);
    expect(flat('pathlines')).toEqual([...grid.pathlines]);
    for (const [name, field] of grid.fields) {
      const { attributes, dimensions } = file.variables[name];
      expect(dimensions).toEqual([...axes].reverse());
      expect(flat(name)).toEqual(printed([...field.values]));
      expect(attributes).toMatchObject({ units: field.unit, long_name: field.longName, _FillValue: null });
      expect(attributes['ancillary_variables'] ?? null).toBe(field.standardError);
    }
  });

  it.skipIf(!python)('h5py reads the same numbers, chunks hold at most 4096 rows', () => {
    for (const [name, variables] of Object.entries(seen.h5py)) {
      for (const [key, { chunks, values }] of Object.entries(variables)) {
        if (chunks.length > 0 && name !== 'grid.nc') expect(chunks[0], key).toBeLessThanOrEqual(4096);
        const other = seen.netcdf[name].variables[key];
        if (other !== undefined) expect(values, `${name} ${key}`).toEqual(other.values);
      }
    }
    expect(Object.keys(seen.h5py['pathlines.nc']).sort()).toEqual(
      [...Object.keys(seen.netcdf['pathlines.nc'].variables), 'sample'].sort(),
    );
  });

  it.skipIf(!python)('the NetCDF library can add to the files', () => {
    expect(seen.writable).toEqual({ 'pathlines.nc': 'yes', 'frames.nc': 'yes', 'grid.nc': 'yes' });
  });

  it.skipIf(!needs('netcdf-bin'))('ncdump prints the dimensions and units', () => {
    const header = execFileSync('ncdump', ['-h', join(folder, 'pathlines.nc')], { encoding: 'utf8' });
    expect(header).toContain(`sample = ${oracle.samples} ;`);
    expect(header).toContain('u:units = "mm/s" ;');
    expect(header).toContain('flags:flag_masks = 1US, 2US, 4US, 8US, 16US, 32US, 64US, 128US ;');
  });

  it.skipIf(!needs('hdf5-tools'))('h5dump reads the columns', () => {
    const dump = execFileSync('h5dump', ['-d', '/detection', '-y', join(folder, 'pathlines.nc')], {
      encoding: 'utf8',
      maxBuffer: 2 ** 26,
    });
    expect(dump).toContain('H5T_STD_I64LE');
    const data = /DATA \{([^}]*)\}/.exec(dump)?.[1] ?? '';
    expect(
      data
        .split(/[\s,]+/)
        .filter(Boolean)
        .map(Number),
    ).toEqual(oracle.columns['detection']);
  });
});
