import type { Quantity } from '../core/quantity.js';
import type { Dimension } from './units.js';

/** What may stand as the value of a setting, in a run sheet and as an option alike. */
export type SettingKind =
  | { readonly type: 'text' }
  | { readonly type: 'choice'; readonly values: readonly string[] }
  | { readonly type: 'yes-no' }
  | {
      readonly type: 'whole';
      readonly least: number;
      readonly most: number;
      readonly odd?: boolean;
      readonly auto?: boolean;
    }
  | { readonly type: 'number'; readonly least: number; readonly most: number }
  | { readonly type: 'share'; readonly most: number }
  | {
      readonly type: 'quantity';
      readonly dimension: Exclude<Dimension, 'share'>;
      readonly sign: 'positive' | 'any';
      readonly auto?: boolean;
    }
  /** Figures that share one unit: `[812, 640] px`. */
  | {
      readonly type: 'vector';
      readonly dimension: 'length' | 'speed';
      readonly least: number;
      readonly most: number;
      readonly sign: 'positive' | 'any';
      readonly auto?: boolean;
    }
  /** Header name, 0-based position, `none` or `auto`. */
  | { readonly type: 'column' }
  | { readonly type: 'files' }
  /** `+x`, `-y` or a vector without unit. */
  | { readonly type: 'direction' }
  | { readonly type: 'bodies' }
  /** Rows of dump x, dump y, true x, true y. */
  | { readonly type: 'points' }
  | { readonly type: 'notes' };

/** Figures with one unit in common and, where written, one standard uncertainty for each of them. */
export interface QuantityVector {
  readonly values: readonly number[];
  readonly unit: string;
  readonly standardUncertainty: number | null;
}

/** A body as written, lengths still in their own unit. */
export type WrittenBody =
  | { readonly kind: 'circle'; readonly centre: QuantityVector; readonly diameter: Quantity }
  | { readonly kind: 'polygon'; readonly points: readonly (readonly number[])[]; readonly unit: string };

/** Control points as written: dump x, dump y in px; true x, true y in `unit` (null: the unit of the results). */
export interface WrittenPoints {
  readonly rows: readonly (readonly [number, number, number, number])[];
  readonly unit: string | null;
}

/** A setting's value once read; which form belongs to which kind is in `readSetting`. */
export type SettingValue =
  | string
  | number
  | boolean
  | null
  | Quantity
  | QuantityVector
  | WrittenPoints
  | readonly string[]
  | readonly number[]
  | readonly WrittenBody[]
  | Readonly<Record<string, string>>;

/** An option as it was given; a list where it was given several times (see `isRepeatable`). */
export type OptionValue = string | number | boolean | readonly string[];

/** One setting: where it stands in the run sheet, what it is called as an option, what it takes, what it does. */
export interface SettingRow {
  /** Dotted path in the run sheet. */
  readonly key: string;
  /** Option name without the leading dashes. */
  readonly option: string;
  readonly kind: SettingKind;
  /** As a person would write it; null where nothing is set unless given. */
  readonly default: string | number | boolean | null;
  /** One line, no full stop. */
  readonly help: string;
  /** As a person would write it as an option's value. */
  readonly example: string;
}

/** Whether an option of this kind may be given several times: once a body, once a note. */
export function isRepeatable(kind: SettingKind): boolean {
  return kind.type === 'bodies' || kind.type === 'notes';
}
