import type { Dims, SampleBlock } from '../core/columns.js';
import type { Hdf5Type } from '../core/hdf5.js';

/** Columns of a SampleBlock that hold one value a row. */
export type SampleKey = Exclude<keyof SampleBlock, 'dims' | 'number' | 'time' | 'segment' | 'offsets' | 'pathline'>;

/** Columns of rows in pathline order: those, and what frame order had apart. */
export type RowKey = SampleKey | 'frame' | 'time';

/** What a column is measured in. */
export type UnitKind = 'length' | 'time' | 'velocity' | 'acceleration' | null;

/** One column of the sample dimension in pathlines.nc. */
export interface SampleColumn {
  readonly key: RowKey;
  /** Name in the file. */
  readonly name: string;
  /** Type in the file. */
  readonly type: Hdf5Type;
  /** Type in memory and in scratch files. */
  readonly stored: 'f64' | 'f32' | 'i32' | 'u16';
  readonly unit: UnitKind;
  readonly longName: string;
  /** Name of the column with its standard error. */
  readonly standardError: string | null;
}

const AXES = ['x', 'y', 'z'] as const;
const VELOCITY = ['u', 'v', 'w'] as const;
const ACCELERATION = ['ax', 'ay', 'az'] as const;

function position(name: SampleKey, type: 'f64' | 'f32', unit: UnitKind, longName: string, se = false): SampleColumn {
  const fileName = name.replace(/Se$/, '_se').replace(/^measured(.)$/, (_, axis) => `measured_${axis.toLowerCase()}`);
  return { key: name, name: fileName, type, stored: type, unit, longName, standardError: se ? `${fileName}_se` : null };
}

/**
 * The columns in the order of the file (part of the file format: append only). Velocity and position always,
 * acceleration unless `pairs`.
 */
export function sampleColumns(dims: Dims, pairs: boolean): readonly SampleColumn[] {
  const axes = AXES.slice(0, dims);
  const acceleration = pairs ? [] : ACCELERATION.slice(0, dims);
  const velocity = VELOCITY.slice(0, dims);
  return [
    {
      key: 'frame',
      name: 'frame',
      type: 'i32',
      stored: 'i32',
      unit: null,
      longName: 'frame number in the dump',
      standardError: null,
    },
    {
      key: 'time',
      name: 'time',
      type: 'f64',
      stored: 'f64',
      unit: 'time',
      longName: 'elapsed time',
      standardError: null,
    },
    ...axes.map((axis) => position(axis, 'f64', 'length', `fitted ${axis} position`, true)),
    ...velocity.map((name, i) => position(name, 'f32', 'velocity', `velocity along ${AXES[i]}`, true)),
    ...acceleration.map((name, i) => position(name, 'f32', 'acceleration', `acceleration along ${AXES[i]}`, true)),
    ...axes.map((axis) => position(`${axis}Se`, 'f32', 'length', `standard error of the fitted ${axis} position`)),
    ...velocity.map((name, i) =>
      position(`${name}Se`, 'f32', 'velocity', `standard error of the velocity along ${AXES[i]}`),
    ),
    ...acceleration.map((name, i) =>
      position(`${name}Se`, 'f32', 'acceleration', `standard error of the acceleration along ${AXES[i]}`),
    ),
    ...axes.map((axis) =>
      position(`measured${axis.toUpperCase() as 'X' | 'Y' | 'Z'}`, 'f64', 'length', `${axis} position as detected`),
    ),
    {
      key: 'linkRisk',
      name: 'link_risk',
      type: 'f32',
      stored: 'f32',
      unit: null,
      longName: 'probability that the link into this sample is wrong',
      standardError: null,
    },
    {
      key: 'detection',
      name: 'detection',
      type: 'i64',
      stored: 'f64',
      unit: null,
      longName: '0-based data row of the detection in the dump',
      standardError: null,
    },
    {
      key: 'flags',
      name: 'flags',
      type: 'u16',
      stored: 'u16',
      unit: null,
      longName: 'reasons to distrust the sample',
      standardError: null,
    },
  ];
}

/** Unit text from the run's units: `mm`, `s`, `mm/s`, `mm/s2`; `1` where there is none. */
export function unitText(kind: UnitKind, units: { readonly length: string; readonly time: string }): string {
  if (kind === 'length') return units.length;
  if (kind === 'time') return units.time;
  if (kind === 'velocity') return `${units.length}/${units.time}`;
  if (kind === 'acceleration') return `${units.length}/${units.time}2`;
  return '1';
}
