import { FLAG, FLAG_MEANING, type FlagName } from '../core/columns.js';
import type { AttributeValue } from './digest.js';
import type { Attributes } from './netcdf-writer.js';
import { SCHEMA_VERSION } from './run-record.js';
import { type SampleColumn, unitText } from './sample-columns.js';

/** Units of a result. */
export interface ResultUnits {
  readonly length: string;
  readonly time: string;
}

/** One sample in this many pathlines (frames) stays when `thinned`. */
export const THINNING = 10;

/** Attributes of the whole file. No date: equal runs give equal files. */
export function fileAttributes(title: string, featureType: string | null, extra: Attributes = {}): Attributes {
  return {
    Conventions: 'CF-1.11',
    ...(featureType === null ? {} : { featureType }),
    title,
    source: 'particle tracking velocimetry',
    wakeloom_schema: SCHEMA_VERSION,
    ...extra,
  };
}

/** Says in the file that only every tenth pathline (frame) is there. */
export function thinningAttributes(keep: 'all' | 'thinned'): Attributes {
  return keep === 'all' ? {} : { thinning: { type: 'i32', values: [THINNING] } };
}

/** CF flag_masks and flag_meanings, and the meanings in plain words. */
export function flagAttributes(): Attributes {
  const names = Object.keys(FLAG) as FlagName[];
  return {
    flag_masks: { type: 'u16', values: names.map((name) => FLAG[name]) },
    // CF allows letters, digits, - _ . + @ in a meaning.
    flag_meanings: names.join(' '),
    comment: names.map((name) => `${name}: ${FLAG_MEANING[name]}`).join('; '),
  };
}

/** Attributes of a sample column; `coordinates` names what places a sample in time and space. */
export function columnAttributes(column: SampleColumn, units: ResultUnits, coordinates: string): Attributes {
  const attributes: Record<string, AttributeValue> = { long_name: column.longName };
  if (column.key === 'flags') return { ...attributes, ...flagAttributes(), coordinates };
  if (column.key !== 'frame' && column.key !== 'detection') attributes['units'] = unitText(column.unit, units);
  const axis = { x: 'X', y: 'Y', z: 'Z' }[column.name];
  if (axis !== undefined) attributes['axis'] = axis;
  if (column.standardError !== null) attributes['ancillary_variables'] = column.standardError;
  if (axis === undefined && column.key !== 'time') attributes['coordinates'] = coordinates;
  if (column.type === 'f32' || column.type === 'f64') {
    if (axis === undefined && column.key !== 'time')
      attributes['_FillValue'] = { type: column.type, values: [Number.NaN] };
  }
  return attributes;
}
