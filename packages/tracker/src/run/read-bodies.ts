import { isWakeloomError } from '../core/errors.js';
import { nearestWord } from '../core/nearest-word.js';
import { parseQuantity } from './parse-quantity.js';
import { readRows } from './read-points.js';
import { readVector } from './read-vector.js';
import type { WrittenBody } from './setting-kinds.js';
import { describeFound, SettingProblem } from './setting-problem.js';

const POINT = { dimension: 'length', least: 2, most: 2, sign: 'any' } as const;
const CIRCLE = { dimension: 'length', least: 3, most: 3, sign: 'any' } as const;

function circle(centre: WrittenBody & { kind: 'circle' }): WrittenBody {
  if (centre.diameter.value > 0) return centre;
  throw new SettingProblem(`got a circle of diameter ${centre.diameter.value}, expected a diameter above zero`);
}

function polygon(raw: unknown, expected: string): WrittenBody {
  const { rows, unit } = readRows(raw, 2, expected);
  if (rows.length < 3) throw new SettingProblem(`got a polygon of ${rows.length} points, expected at least 3`);
  if (unit === null) throw new SettingProblem('got a polygon without a unit, expected one such as "0 0; 5 0; 5 5 mm"');
  return { kind: 'polygon', points: rows, unit };
}

function fromText(text: string, expected: string): WrittenBody {
  const [, word = '', rest = ''] = /^\s*(\S+)\s*(.*)$/s.exec(text) ?? [];
  if (word === 'circle') {
    const { values, unit } = readVector(CIRCLE, rest, 'circle x, y, diameter with a unit');
    const centre = { values: values.slice(0, 2), unit, standardUncertainty: null };
    return circle({ kind: 'circle', centre, diameter: { value: values[2]!, unit, standardUncertainty: null } });
  }
  if (word === 'polygon') return polygon(rest, 'polygon x y; x y; ... with a unit');
  throw new SettingProblem(`got ${describeFound(text)}, expected ${expected}`);
}

function fromKeys(item: Readonly<Record<string, unknown>>, expected: string): WrittenBody {
  const [kind, ...more] = Object.keys(item);
  if (kind === undefined || more.length > 0)
    throw new SettingProblem(`got ${describeFound(item)}, expected ${expected}`);
  if (kind === 'polygon') return polygon(item['polygon'], 'polygon corners such as "0 0; 5 0; 5 5 mm"');
  const inner = item[kind];
  if (kind !== 'circle' || typeof inner !== 'object' || inner === null) {
    const near = nearestWord(kind, ['circle', 'polygon']);
    const hint = near === null || near === kind ? '' : ` (nearest is "${near}")`;
    throw new SettingProblem(`got ${describeFound(item)}, expected circle or polygon${hint}`);
  }
  const unknown = Object.keys(inner).find((key) => key !== 'centre' && key !== 'diameter');
  if (unknown !== undefined) {
    const near = nearestWord(unknown, ['centre', 'diameter']);
    throw new SettingProblem(
      `got the key "${unknown}" in circle, expected centre and diameter${near ? ` (nearest is "${near}")` : ''}`,
    );
  }
  const { centre, diameter } = inner as { centre?: unknown; diameter?: unknown };
  if (typeof diameter !== 'string')
    throw new SettingProblem(`got ${describeFound(diameter)} as diameter, expected a length such as "5 mm"`);
  try {
    return circle({
      kind: 'circle',
      centre: readVector(POINT, centre, 'the centre of a circle such as "0, 0 mm"'),
      diameter: parseQuantity(diameter, 'length'),
    });
  } catch (error) {
    if (isWakeloomError(error)) throw new SettingProblem(error.message);
    throw error;
  }
}

/**
 * Bodies from a sheet's list (`[ { circle: { centre: [0, 0] mm, diameter: 5 mm } } ]`) or from an option's text
 * (`circle 0, 0, 5 mm`; several joined by ` and `, or a list of such texts). Throws `SettingProblem`.
 */
export function readBodies(raw: unknown, expected: string): readonly WrittenBody[] {
  const given: readonly unknown[] = Array.isArray(raw) ? raw : [raw];
  const items = given.flatMap((item) => (typeof item === 'string' ? item.split(/\s+and\s+/) : [item]));
  return items.map((item: unknown) => {
    if (typeof item === 'string') return fromText(item, expected);
    if (typeof item === 'object' && item !== null && !Array.isArray(item)) {
      return fromKeys(item as Readonly<Record<string, unknown>>, expected);
    }
    throw new SettingProblem(`got ${describeFound(item)}, expected ${expected}`);
  });
}
