/** What kind of figure a setting wants. `scale` is length per pixel, `share` a part of one, `bytes` a size of data. */
export type Dimension =
  | 'length'
  | 'time'
  | 'frequency'
  | 'speed'
  | 'angle'
  | 'density'
  | 'viscosity'
  | 'temperature'
  | 'scale'
  | 'share'
  | 'bytes';

/**
 * A unit and its place against the base unit of its kind: value in base = value * num / den + offset. Two
 * whole numbers instead of one factor, so that a change between decimal units costs one rounding and no more.
 */
export interface Unit {
  /** The one spelling that results carry. */
  readonly symbol: string;
  readonly dimension: Dimension;
  /** Only units with the same base convert into each other: `m` and `px` are both lengths and do not. */
  readonly base: string;
  readonly num: number;
  readonly den: number;
  readonly offset: number;
}

type Row = readonly [
  symbol: string,
  base: string,
  num: number,
  den: number,
  other?: readonly string[],
  offset?: number,
];

// The inch is 25.4 mm exactly (international yard and pound agreement, 1959). Bytes: SI and IEC 80000-13 prefixes.
const SIMPLE: Readonly<Record<Exclude<Dimension, 'speed' | 'scale' | 'viscosity'>, readonly Row[]>> = {
  length: [
    ['m', 'm', 1, 1],
    ['cm', 'm', 1, 1e2],
    ['mm', 'm', 1, 1e3],
    ['um', 'm', 1, 1e6, ['\u00b5m', '\u03bcm']],
    ['nm', 'm', 1, 1e9],
    ['in', 'm', 254, 1e4],
    ['px', 'px', 1, 1, ['pixel', 'pixels']],
  ],
  time: [
    ['s', 's', 1, 1],
    ['ms', 's', 1, 1e3],
    ['us', 's', 1, 1e6, ['\u00b5s', '\u03bcs']],
    ['ns', 's', 1, 1e9],
    ['min', 's', 60, 1],
    ['h', 's', 3600, 1],
    ['frame', 'frame', 1, 1, ['frames']],
  ],
  frequency: [
    ['Hz', 'Hz', 1, 1, ['1/s', 'fps']],
    ['kHz', 'Hz', 1e3, 1],
    ['MHz', 'Hz', 1e6, 1],
  ],
  angle: [
    ['deg', 'deg', 1, 1, ['\u00b0']],
    ['rad', 'deg', 180, Math.PI],
    ['mrad', 'deg', 180, 1000 * Math.PI],
  ],
  density: [
    ['kg/m3', 'kg/m3', 1, 1, ['kg/m^3', 'kg/m\u00b3']],
    ['g/cm3', 'kg/m3', 1e3, 1, ['g/cm^3', 'g/cm\u00b3', 'g/ml']],
  ],
  temperature: [
    ['degC', 'K', 1, 1, ['\u00b0C'], 273.15],
    ['K', 'K', 1, 1],
  ],
  share: [
    ['1', '1', 1, 1, ['']],
    ['%', '1', 1, 1e2],
  ],
  bytes: [
    ['B', 'B', 1, 1],
    ['kB', 'B', 1e3, 1],
    ['MB', 'B', 1e6, 1],
    ['GB', 'B', 1e9, 1],
    ['KiB', 'B', 1024, 1],
    ['MiB', 'B', 1024 ** 2, 1],
    ['GiB', 'B', 1024 ** 3, 1],
  ],
};

function simpleUnits(dimension: keyof typeof SIMPLE): ReadonlyMap<string, Unit> {
  const units = new Map<string, Unit>();
  for (const [symbol, base, num, den, other = [], offset = 0] of SIMPLE[dimension]) {
    const unit: Unit = { symbol, dimension, base, num, den, offset };
    for (const name of [symbol, ...other]) units.set(name, unit);
  }
  return units;
}

function quotients(dimension: Dimension, above: ReadonlyMap<string, Unit>, below: ReadonlyMap<string, Unit>) {
  const units = new Map<string, Unit>();
  for (const [aboveName, a] of above) {
    for (const [belowName, b] of below) {
      const symbol = `${a.symbol}/${b.symbol}`;
      const unit: Unit = {
        symbol,
        dimension,
        base: `${a.base}/${b.base}`,
        num: a.num * b.den,
        den: a.den * b.num,
        offset: 0,
      };
      units.set(`${aboveName}/${belowName}`, unit);
    }
  }
  return units;
}

function viscosityUnits(): ReadonlyMap<string, Unit> {
  const units = new Map<string, Unit>();
  const add = (symbol: string, den: number, other: readonly string[]) => {
    const unit: Unit = { symbol, dimension: 'viscosity', base: 'm2/s', num: 1, den, offset: 0 };
    for (const name of [symbol, ...other]) units.set(name, unit);
  };
  add('m2/s', 1, ['m^2/s', 'm\u00b2/s']);
  add('cm2/s', 1e4, ['cm^2/s', 'cm\u00b2/s']);
  add('mm2/s', 1e6, ['mm^2/s', 'mm\u00b2/s', 'cSt']);
  return units;
}

const LENGTH = simpleUnits('length');
const TRUE_LENGTH = new Map([...LENGTH].filter(([, unit]) => unit.base === 'm'));
const PIXEL = new Map([...LENGTH].filter(([, unit]) => unit.base === 'px'));

const UNITS: Readonly<Record<Dimension, ReadonlyMap<string, Unit>>> = {
  length: LENGTH,
  time: simpleUnits('time'),
  frequency: simpleUnits('frequency'),
  speed: quotients('speed', LENGTH, simpleUnits('time')),
  angle: simpleUnits('angle'),
  density: simpleUnits('density'),
  viscosity: viscosityUnits(),
  temperature: simpleUnits('temperature'),
  // Pixels per length is what many calibrations print; `parseQuantity` turns it over.
  scale: new Map([...quotients('scale', TRUE_LENGTH, PIXEL), ...quotients('scale', PIXEL, TRUE_LENGTH)]),
  share: simpleUnits('share'),
  bytes: simpleUnits('bytes'),
};

/** The unit that `text` spells among those of a dimension, or null. Units are spelled with care for capitals. */
export function findUnit(text: string, dimension: Dimension): Unit | null {
  return UNITS[dimension].get(text.replace(/\s+/g, '')) ?? null;
}

/** The dimension that knows `text` as a unit, for messages that say what was found instead. */
export function dimensionOf(text: string): Dimension | null {
  const known = (Object.keys(UNITS) as Dimension[]).filter((dimension) => UNITS[dimension].has(text));
  return known[0] ?? null;
}

/** Every accepted spelling of the units of a dimension, for hints and for the editor schema. */
export function unitNames(dimension: Dimension): readonly string[] {
  return [...UNITS[dimension].keys()].filter((name) => name !== '');
}

/**
 * A value in another unit of the same base, or null where the bases differ (px into mm needs the scale of the
 * run, which this table does not know). One multiplication or division: exact to half a unit in the last place
 * between decimal units. With `difference`, offsets are left out (an uncertainty in degC is one in K).
 */
export function convertUnit(value: number, from: Unit, to: Unit, difference = false): number | null {
  if (from.base !== to.base) return null;
  if (from.symbol === to.symbol) return value;
  const above = from.num * to.den;
  const below = from.den * to.num;
  const scaled = above >= below ? value * (above / below) : value / (below / above);
  return difference ? scaled : scaled + (from.offset - to.offset) * (to.den / to.num);
}
