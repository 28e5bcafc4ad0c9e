import type { Quantity } from '../core/quantity.js';
import type { GivenSettings } from './given-settings.js';
import { SETTING_TABLE } from './options.js';
import type { QuantityVector, SettingValue, WrittenBody, WrittenPoints } from './setting-kinds.js';
import type { SettingRecord } from './settings.js';

function bodyText(body: WrittenBody): string {
  if (body.kind === 'circle') {
    const { values, unit } = body.centre;
    return `circle at ${values.join(', ')} ${unit}, diameter ${body.diameter.value} ${body.diameter.unit}`;
  }
  return `polygon ${body.points.map((point) => point.join(' ')).join('; ')} ${body.unit}`;
}

type Plain = Pick<SettingRecord, 'value' | 'unit'> & { readonly uncertainty?: number | null };

function plain(type: string, value: SettingValue): Plain {
  if (value === null || typeof value !== 'object') return { value, unit: null };
  if (type === 'quantity') {
    const quantity = value as Quantity;
    return { value: quantity.value, unit: quantity.unit, uncertainty: quantity.standardUncertainty };
  }
  if (type === 'vector') {
    const vector = value as QuantityVector;
    return { value: vector.values, unit: vector.unit, uncertainty: vector.standardUncertainty };
  }
  if (type === 'points') {
    const points = value as WrittenPoints;
    return { value: points.rows.flat(), unit: points.unit };
  }
  if (type === 'bodies') return { value: (value as readonly WrittenBody[]).map(bodyText), unit: null };
  if (type === 'notes') return { value: Object.entries(value).map(([name, text]) => `${name}: ${text}`), unit: null };
  return { value: value as readonly (string | number)[], unit: null };
}

/**
 * Every setting with its value as given and its origin, in the order of `SETTING_TABLE`. A known uncertainty
 * stands in a line of its own under `<key>.standard-uncertainty`, in the unit of the figure.
 */
export function settingRecords(given: GivenSettings): readonly SettingRecord[] {
  const records: SettingRecord[] = [];
  for (const { key, kind } of SETTING_TABLE) {
    const { value, unit, uncertainty } = plain(kind.type, given.value(key));
    const origin = given.origin(key);
    records.push({ key, value, unit, origin });
    if (typeof uncertainty === 'number') {
      records.push({ key: `${key}.standard-uncertainty`, value: uncertainty, unit, origin });
    }
  }
  return records;
}
