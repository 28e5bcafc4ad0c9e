import { WakeloomError } from '../core/errors.js';
import { nearestWord } from '../core/nearest-word.js';
import type { Quantity } from '../core/quantity.js';
import { convertUnit, type Dimension, dimensionOf, findUnit, type Unit, unitNames } from './units.js';

/** How each dimension is named and shown in messages. */
export const DIMENSION_WORDS: Readonly<Record<Dimension, { readonly name: string; readonly example: string }>> = {
  length: { name: 'a length', example: '2 mm' },
  time: { name: 'a time', example: '400 us' },
  frequency: { name: 'a frequency', example: '500 Hz' },
  speed: { name: 'a speed', example: '30 mm/s' },
  angle: { name: 'an angle', example: '1.5 deg' },
  density: { name: 'a density', example: '1030 kg/m3' },
  viscosity: { name: 'a kinematic viscosity', example: '1.0 mm2/s' },
  temperature: { name: 'a temperature', example: '20 degC' },
  scale: { name: 'a scale', example: '0.05 mm/px' },
  share: { name: 'a share', example: '5 %' },
  bytes: { name: 'a size of data', example: '256 MB' },
};

const NUMBER = String.raw`[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?`;
const SHAPE = new RegExp(
  String.raw`^(${NUMBER})\s*([^\s\d+\u00b1,.-][^+\u00b1]*?|1/s)?\s*(?:(?:\+-|\u00b1|\+/-)\s*(.*))?$`,
);
const SPREAD = new RegExp(String.raw`^(${NUMBER})\s*(\S.*)?$`);

function refuse(what: 'quantity' | 'unit', text: string, wanted: Dimension, hint = ''): never {
  const { name, example } = DIMENSION_WORDS[wanted];
  throw new WakeloomError(
    what === 'unit' ? 'usage/unit' : 'usage/quantity',
    `${name.replace(/^an? /, '')}: got ${JSON.stringify(text)}, expected ${name} such as "${example}"${hint}`,
    { text, wanted },
  );
}

function unitOf(spelled: string, text: string, wanted: Dimension): Unit {
  const unit = findUnit(spelled, wanted);
  if (unit !== null) return unit;
  const other = dimensionOf(spelled);
  if (other !== null)
    return refuse(
      'unit',
      text,
      wanted,
      ` ("${spelled}" is ${DIMENSION_WORDS[other].name} unit)`.replace(/(an?) (.*) unit/, 'a unit of $2'),
    );
  const near = nearestWord(spelled, unitNames(wanted));
  return refuse(
    'unit',
    text,
    wanted,
    near === null ? ` (unit "${spelled}" is not known)` : ` (unit "${spelled}" is not known; nearest is "${near}")`,
  );
}

/**
 * Reads a figure with its unit and, where written, its standard uncertainty: `500 Hz`, `0.0500 +- 0.0002 mm/px`,
 * `60 Hz ± 0.02 %`, `20 degC`. The unit stays as written but in its one spelling (`µm` becomes `um`, `cSt`
 * `mm2/s`); a scale in pixels per length is turned over, its uncertainty with it. Without `+-` the uncertainty is
 * null (unknown), which is not the same as 0.
 *
 * Codes: `usage/quantity` where no figure can be read, `usage/unit` where the unit is missing or of another kind;
 * the message says what was found, what is expected and the nearest known unit.
 *
 * @example
 * parseQuantity('0.0500 +- 0.0002 mm/px', 'scale'); // { value: 0.05, unit: 'mm/px', standardUncertainty: 0.0002 }
 */
export function parseQuantity(text: string, wanted: Dimension): Quantity {
  const shape = SHAPE.exec(text.trim());
  if (shape === null) {
    const comma = /^[+-]?\d+,\d+(\s|$)/.test(text.trim()) ? ' (write a decimal point, not a comma)' : '';
    return refuse('quantity', text, wanted, comma);
  }
  const value = Number(shape[1]);
  if (!Number.isFinite(value)) return refuse('quantity', text, wanted, ' (the figure is too large)');
  const spread = shape[3] === undefined ? null : SPREAD.exec(shape[3].trim());
  if (shape[3] !== undefined && spread === null) return refuse('quantity', text, wanted, ' (no figure after "+-")');
  const before = shape[2]?.trim();
  const after = spread?.[2]?.trim();
  const relative = after === '%' && before !== undefined && before !== '%';
  const spelled = before ?? after ?? '';
  if (spelled === '' && wanted !== 'share') {
    const missing = `(the unit is missing; known are ${unitNames(wanted).slice(0, 6).join(', ')})`;
    return refuse('unit', text, wanted, ` ${missing}`);
  }
  const unit = unitOf(spelled, text, wanted);
  let uncertainty: number | null = null;
  if (spread !== null) {
    const size = Number(spread[1]);
    if (!(size >= 0)) return refuse('quantity', text, wanted, ' (an uncertainty is not negative)');
    if (relative) uncertainty = (Math.abs(value) * size) / 100;
    else if (before === undefined || after === undefined) uncertainty = size;
    else {
      uncertainty = convertUnit(size, unitOf(after, text, wanted), unit, true);
      if (uncertainty === null) return refuse('unit', text, wanted, ` ("${after}" does not convert into "${spelled}")`);
    }
  }
  if (wanted === 'scale' && unit.base === 'px/m') return turnedOver(value, unit, uncertainty, text);
  return { value, unit: unit.symbol, standardUncertainty: uncertainty };
}

/** Pixels per length as length per pixel; the relative uncertainty stays the same. */
function turnedOver(value: number, unit: Unit, uncertainty: number | null, text: string): Quantity {
  if (value === 0) return refuse('quantity', text, 'scale', ' (a scale is not 0)');
  const [pixel, length] = unit.symbol.split('/');
  return {
    value: 1 / value,
    unit: `${length}/${pixel}`,
    standardUncertainty: uncertainty === null ? null : uncertainty / (value * value),
  };
}

/**
 * The same quantity in another unit of its dimension. Code `usage/unit` where the two do not convert (px into mm
 * takes the scale of the run).
 */
export function quantityIn(quantity: Quantity, unit: string, dimension: Dimension): Quantity {
  const from = findUnit(quantity.unit, dimension);
  const to = findUnit(unit, dimension);
  const value = from && to ? convertUnit(quantity.value, from, to) : null;
  if (from === null || to === null || value === null) {
    const { name } = DIMENSION_WORDS[dimension];
    throw new WakeloomError(
      'usage/unit',
      `unit: got ${name} in ${quantity.unit}, expected one that converts into ${unit}`,
      { from: quantity.unit, to: unit },
    );
  }
  const spread = quantity.standardUncertainty;
  return {
    value,
    unit: to.symbol,
    standardUncertainty: spread === null ? null : convertUnit(spread, from, to, true),
  };
}
