import { WakeloomError } from '@wakeloom/tracker';
import { float32Text } from '@wakeloom/tracker/store/exports/csv';
import { divisorFor, unitPowers } from '@wakeloom/tracker/store/exports/normalise';
import { EXPORTERS, exportGrid, exportPathlines } from '@wakeloom/tracker/store/exports/registry';
import Papa from 'papaparse';
import { describe, expect, it } from 'vitest';
import { madeGrid, madeSource, madeValue, memorySink } from '../helpers/export-sources.js';

const MM_S = { length: 'mm', time: 's' };

function parse(text: string) {
  const { data, errors } = Papa.parse<string[]>(text.trimEnd(), { header: false });
  expect(errors).toEqual([]);
  const [names, ...rows] = data;
  return { names: names!, rows };
}

async function pathlinesCsv(...args: [Parameters<typeof exportPathlines>[0], Parameters<typeof exportPathlines>[3]?]) {
  const sink = memorySink();
  const summary = await exportPathlines(args[0], 'csv', sink, args[1]);
  expect(summary.bytes).toBe(sink.bytes().length);
  return { ...parse(sink.text()), summary };
}

describe('pathlines as CSV', () => {
  it('has the columns that users rely on, in that order', async () => {
    const plane = await pathlinesCsv(madeSource(2, [2]));
    expect(plane.names.slice(0, 13).join()).toBe('pathline,frame,detection,t,x,y,u,v,ax,ay,u_se,v_se,flags');
    const volume = await pathlinesCsv(madeSource(3, [2]));
    expect(volume.names.slice(0, 17).join()).toBe(
      'pathline,frame,detection,t,x,y,z,u,v,w,ax,ay,az,u_se,v_se,w_se,flags',
    );
    expect(volume.summary.columns).toEqual(volume.names);
  });

  it.each([1, 2, 5, 1000])('gives back every figure when read %i rows at a time', async (step) => {
    const source = madeSource(3, [3, 1, 4, 2]);
    const { names, rows, summary } = await pathlinesCsv(source, { rows: step });
    expect(rows).toHaveLength(10);
    expect(summary.rows).toBe(10);
    const numbers = [3, 3, 3, 13, 23, 23, 23, 23, 33, 33];
    rows.forEach((row, r) => {
      names.forEach((name, c) => {
        const variable = name === 't' ? 'time' : name;
        const wanted =
          name === 'pathline'
            ? numbers[r]!
            : name === 'detection'
              ? 2 ** 40 + r
              : ['frame', 'flags'].includes(name)
                ? r
                : madeValue(variable, r);
        expect(Number(row[c]), `${name} of row ${r}`).toBe(wanted);
      });
    });
  });

  it('leaves the cells of image pairs empty where accelerations would stand, and says so', async () => {
    const { names, rows, summary } = await pathlinesCsv(madeSource(2, [2, 2], true));
    expect(names).toContain('ax');
    for (const row of rows) {
      for (const name of ['ax', 'ay', 'ax_se', 'ay_se']) expect(row[names.indexOf(name)]).toBe('');
      expect(row[names.indexOf('u')]).not.toBe('');
    }
    expect(summary.remarks.join(' ')).toMatch(/no ax, ay, ax_se, ay_se \(image pairs/);
  });

  it('divides by a length and a speed', async () => {
    const source = madeSource(2, [4]);
    const plain = await pathlinesCsv(source);
    // Powers of two, so that the expected figures are exact.
    const scaled = await pathlinesCsv(source, { normalise: { length: 4, speed: 16 } });
    const divisors: Record<string, number> = {
      t: 1 / 4,
      x: 4,
      measured_y: 4,
      x_se: 4,
      u: 16,
      v_se: 16,
      ax: 64,
      ay_se: 64,
      flags: 1,
      frame: 1,
      link_risk: 1,
    };
    for (const [name, divisor] of Object.entries(divisors)) {
      const c = plain.names.indexOf(name);
      plain.rows.forEach((row, r) => {
        // A 32-bit figure comes as its shortest text: rounding to 32 bits gives it back, and changes no other here.
        expect(Math.fround(Number(scaled.rows[r]![c])), name).toBe(Number(row[c]) / divisor);
      });
    }
    expect(scaled.summary.remarks.join(' ')).toContain('length of 4 mm and a speed of 16 mm/s');
  });

  it('reads only the rows asked for, each column once', async () => {
    const source = madeSource(2, [5, 5]);
    await pathlinesCsv(source, { rows: 4 });
    expect(source.asked.filter((entry) => entry.startsWith('u '))).toEqual(['u 0-4', 'u 4-8', 'u 8-10']);
  });

  it('writes only the header for a result without samples', async () => {
    const { names, rows } = await pathlinesCsv(madeSource(2, []));
    expect(names[0]).toBe('pathline');
    expect(rows).toHaveLength(0);
  });

  it('refuses a folder that lacks what every result has', async () => {
    const source = madeSource(2, [1]);
    const broken = { ...source, variables: source.variables.filter((name) => name !== 'time') };
    await expect(exportPathlines(broken, 'csv', memorySink())).rejects.toMatchObject({
      code: 'store/variable-missing',
    });
  });

  it('passes on what a sink throws', async () => {
    const full = new WakeloomError('store/disk-full', 'disk full');
    const sink = { write: () => Promise.reject(full), close: () => Promise.resolve() };
    await expect(exportPathlines(madeSource(2, [1]), 'csv', sink)).rejects.toBe(full);
  });
});

describe('grid as CSV', () => {
  it('has means, their standard errors, then stresses, and one row a bin with x fastest', async () => {
    const sink = memorySink();
    await exportGrid(madeGrid(2), MM_S, 'csv', sink);
    const { names, rows } = parse(sink.text());
    expect(names.join()).toBe('x,y,samples,pathlines,u,v,u_se,v_se,uu,uv,vv,uu_raw,uv_raw,vv_raw');
    expect(rows.map((row) => [Number(row[0]), Number(row[1])])).toEqual([
      [-1, 0.5],
      [-0.5, 0.5],
      [0, 0.5],
      [-1, 1.5],
      [-0.5, 1.5],
      [0, 1.5],
    ]);
    expect(rows[1]!.slice(2)).toEqual(['0', '0', ...Array<string>(10).fill('')]);
    expect(Number(rows[5]![names.indexOf('uv')])).toBe(madeValue('uv', 5));
    expect(rows[2]![2]).toBe('102');
  });

  it('has z, w and six stresses in a volume, normalised if asked', async () => {
    const sink = memorySink();
    await exportGrid(madeGrid(3), MM_S, 'csv', sink, { normalise: { length: 2, speed: 8 } });
    const { names, rows } = parse(sink.text());
    expect(names.slice(0, 17).join()).toBe('x,y,z,samples,pathlines,u,v,w,u_se,v_se,w_se,uu,uv,vv,uw,vw,ww');
    expect(rows).toHaveLength(12);
    const last = rows[11]!;
    expect(last.slice(0, 3).map(Number)).toEqual([0, 0.75, 3]);
    expect(last[3]).toBe('111');
    expect(Number(last[names.indexOf('w')])).toBe(madeValue('w', 11) / 8);
    expect(Math.fround(Number(last[names.indexOf('vw')]))).toBe(madeValue('vw', 11) / 64);
  });
});

describe('figures and units of exports', () => {
  it('writes 32-bit figures as text that reads back to the same bits', () => {
    expect(float32Text(Math.fround(0.1))).toBe('0.1');
    expect(float32Text(Math.fround(1 / 3))).toBe('0.33333334');
    expect(float32Text(-0)).toBe('0');
    // A walk over bit patterns with a stride coprime to 2^32.
    const bits = new Uint32Array(1);
    const value = new Float32Array(bits.buffer);
    for (let i = 0; i < 20000; i++) {
      bits[0] = Math.imul(i, 2654435761);
      if (!Number.isFinite(value[0]!)) continue;
      expect(Math.fround(Number(float32Text(value[0]!)))).toBe(value[0] === 0 ? 0 : value[0]);
    }
  });

  it('takes powers of length and time from a unit', () => {
    expect(unitPowers('mm2/s2', MM_S)).toEqual({ length: 2, time: -2 });
    expect(unitPowers('1/s', MM_S)).toEqual({ length: 0, time: -1 });
    expect(unitPowers('1', MM_S)).toEqual({ length: 0, time: 0 });
    expect(unitPowers('Pa', MM_S)).toBeNull();
    // Vorticity times L / U.
    expect(divisorFor('1/s', MM_S, { length: 5, speed: 30 })).toBe(6);
    expect(() => divisorFor('mm', MM_S, { length: 0, speed: 1 })).toThrow(
      expect.objectContaining({ code: 'usage/normalise' }),
    );
    expect(() => divisorFor('Pa', MM_S, { length: 1, speed: 1 })).toThrow(
      expect.objectContaining({ code: 'usage/normalise' }),
    );
  });

  it('names the formats when one is not known', async () => {
    expect(EXPORTERS.map((exporter) => exporter.format)).toEqual(['csv', 'parquet', 'npy', 'vtk']);
    await expect(exportPathlines(madeSource(2, [1]), 'xls', memorySink())).rejects.toMatchObject({
      code: 'usage/export-format',
      message: expect.stringContaining('expected one of csv, parquet, npy, vtk'),
    });
  });
});
