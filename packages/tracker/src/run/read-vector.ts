import { isWakeloomError } from '../core/errors.js';
import type { Quantity } from '../core/quantity.js';
import { parseQuantity, quantityIn } from './parse-quantity.js';
import type { QuantityVector } from './setting-kinds.js';
import { describeFound, SettingProblem } from './setting-problem.js';

interface VectorShape {
  readonly dimension: 'length' | 'speed';
  readonly least: number;
  readonly most: number;
  readonly sign: 'positive' | 'any';
}

/** Figures with no unit of their own take that of the last one: `812, 640 px`. */
function parsePart(text: string, unit: string, dimension: 'length' | 'speed'): Quantity {
  const bare = /^[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?$/.test(text);
  return parseQuantity(bare ? `${text} ${unit}` : text, dimension);
}

function splitText(text: string): string[] {
  const inner = text.trim().replace(/^\[([^\]]*)\]/, '$1');
  return inner.includes(',') ? inner.split(',').map((part) => part.trim()) : [inner.trim()];
}

/**
 * Figures that share a unit, written as text (`812, 640 px`, `[812, 640] +- 0.5 px`) or as a list whose last item
 * carries the unit (`[812 px, 640 px]`, `[812, 640 px]`). An uncertainty holds for each of them. Throws
 * `SettingProblem`; `expected` is what the message says it should have been.
 */
export function readVector(shape: VectorShape, raw: unknown, expected: string): QuantityVector {
  const refuse = (hint = ''): never => {
    throw new SettingProblem(`got ${describeFound(raw)}, expected ${expected}${hint}`);
  };
  const list = Array.isArray(raw)
    ? raw
    : typeof raw === 'string' || typeof raw === 'number'
      ? splitText(String(raw))
      : refuse();
  const parts = list.map((item) =>
    typeof item === 'string' || typeof item === 'number' ? String(item).trim() : refuse(),
  );
  if (parts.length < shape.least || parts.length > shape.most) return refuse();
  try {
    const last = parseQuantity(parts[parts.length - 1]!, shape.dimension);
    const all = parts.map((part) =>
      quantityIn(parsePart(part, last.unit, shape.dimension), last.unit, shape.dimension),
    );
    const values = all.map((item) => item.value);
    if (shape.sign === 'positive' && values.some((value) => !(value > 0))) return refuse();
    return { values, unit: last.unit, standardUncertainty: last.standardUncertainty };
  } catch (error) {
    if (!isWakeloomError(error)) throw error;
    const hint = /\([^()]*\)$/.exec(error.message);
    return refuse(hint === null ? '' : ` ${hint[0]}`);
  }
}
