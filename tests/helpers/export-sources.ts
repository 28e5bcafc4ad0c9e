import type { Dims, GridResult } from '@wakeloom/tracker';
import type { NumericArray } from '@wakeloom/tracker/core/hdf5';
import type { PathlineSource } from '@wakeloom/tracker/store/exports/pathline-table';

/** A sink that keeps what it is given. */
export function memorySink() {
  const parts: Uint8Array[] = [];
  return {
    write: (bytes: Uint8Array) => {
      parts.push(bytes.slice());
      return Promise.resolve();
    },
    close: () => Promise.resolve(),
    bytes: () => new Uint8Array(Buffer.concat(parts)),
    text: () => Buffer.concat(parts).toString('utf8'),
  };
}

/** Value of a variable in a row: exact in 32 bits, different in every column. Made up for the tests. */
export function madeValue(variable: string, row: number): number {
  const code = [...variable].reduce((sum, letter) => sum + letter.charCodeAt(0), 0);
  return code + row / 8;
}

const WHOLE = ['frame', 'detection', 'flags'];

/** Pathlines of the given lengths with made-up figures; `detection` lies beyond 32 bits. */
export function madeSource(
  dims: Dims,
  rowSize: readonly number[],
  pairs = false,
): PathlineSource & { asked: string[] } {
  const axes = (names: string[]) => names.slice(0, dims);
  const variables = [
    'frame',
    'time',
    ...axes(['x', 'y', 'z']),
    ...axes(['u', 'v', 'w']),
    ...(pairs ? [] : axes(['ax', 'ay', 'az'])),
    ...axes(['x_se', 'y_se', 'z_se']),
    ...axes(['u_se', 'v_se', 'w_se']),
    ...(pairs ? [] : axes(['ax_se', 'ay_se', 'az_se'])),
    ...axes(['measured_x', 'measured_y', 'measured_z']),
    'link_risk',
    'detection',
    'flags',
  ];
  const asked: string[] = [];
  return {
    dims,
    units: { length: 'mm', time: 's' },
    samples: rowSize.reduce((sum, size) => sum + size, 0),
    number: Int32Array.from(rowSize, (_, p) => 10 * p + 3),
    rowSize: Int32Array.from(rowSize),
    variables,
    asked,
    rows(variable, start, end): NumericArray {
      if (!variables.includes(variable)) throw new Error(`no variable ${variable}`);
      asked.push(`${variable} ${start}-${end}`);
      const values = new Float64Array(end - start);
      for (let row = start; row < end; row++) {
        values[row - start] =
          variable === 'detection' ? 2 ** 40 + row : WHOLE.includes(variable) ? row : madeValue(variable, row);
      }
      if (variable === 'flags') return Uint16Array.from(values);
      if (variable === 'frame') return Int32Array.from(values);
      return /^(x|y|z|time|detection|measured_.)$/.test(variable) ? values : Float32Array.from(values);
    },
  };
}

/** A grid of 3 by 2 (by 2) bins; bin 1 is empty. */
export function madeGrid(dims: Dims): GridResult {
  const count = [3, 2, dims === 3 ? 2 : 1] as const;
  const bins = count[0] * count[1] * count[2];
  const field = (name: string, unit: string) => ({
    values: Float32Array.from({ length: bins }, (_, bin) => (bin === 1 ? Number.NaN : madeValue(name, bin))),
    unit,
    longName: name,
    standardError: null,
  });
  const velocity = ['u', 'v', 'w'].slice(0, dims);
  const stresses = dims === 2 ? ['uu', 'uv', 'vv'] : ['uu', 'uv', 'vv', 'uw', 'vw', 'ww'];
  const fields = new Map([
    // In an order of its own, so that the order of the export is its own doing.
    ...stresses.map((name) => [name, field(name, 'mm2/s2')] as const),
    ...stresses.map((name) => [`${name}_raw`, field(`${name}_raw`, 'mm2/s2')] as const),
    ...velocity.map((name) => [`${name}_se`, field(`${name}_se`, 'mm/s')] as const),
    ...velocity.map((name) => [name, field(name, 'mm/s')] as const),
  ]);
  return {
    shape: { dims, count, first: [-1, 0.5, 2], step: [0.5, 1, 4], size: [0.5, 1, 4] },
    samples: Float64Array.from({ length: bins }, (_, bin) => (bin === 1 ? 0 : 100 + bin)),
    pathlines: Float64Array.from({ length: bins }, (_, bin) => (bin === 1 ? 0 : 10 + bin)),
    fields,
  };
}
