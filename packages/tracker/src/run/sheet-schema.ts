import { z } from 'zod';
import { SETTING_TABLE } from './options.js';
import { DIMENSION_WORDS } from './parse-quantity.js';
import { expectedOf, readSetting } from './read-setting.js';
import type { SettingKind, SettingRow } from './setting-kinds.js';
import { SettingProblem } from './setting-problem.js';

// Else the schema would try to make code from text, which pages with a strict content policy forbid and report.
z.config({ jitless: true });

type JsonForm = Readonly<Record<string, unknown>>;

const AUTO: JsonForm = { const: 'auto' };
const NUMBER_TEXT = String.raw`[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?`;

function orAuto(form: JsonForm, kind: SettingKind): JsonForm {
  return 'auto' in kind && kind.auto ? { anyOf: [form, AUTO] } : form;
}

/** What an editor should let pass for a kind; the sheet's own reader is the judge of units and of what fits together. */
function jsonForm(kind: SettingKind): JsonForm {
  const figure = { type: 'string', pattern: `^\\s*${NUMBER_TEXT}` };
  switch (kind.type) {
    case 'text':
      return { type: ['string', 'number'] };
    case 'choice':
      return { enum: kind.values.includes('yes') ? [...kind.values, true, false] : kind.values };
    case 'yes-no':
      return { enum: [true, false, 'yes', 'no'] };
    case 'whole':
      return orAuto({ type: 'integer', minimum: kind.least, maximum: kind.most }, kind);
    case 'number':
      return { type: 'number', minimum: kind.least, maximum: kind.most };
    case 'share':
      return {
        anyOf: [
          { type: 'number', minimum: 0, maximum: kind.most },
          { type: 'string', pattern: '%\\s*$' },
        ],
      };
    case 'quantity':
      return orAuto(figure, kind);
    case 'vector': {
      const list = { type: 'array', minItems: kind.least, maxItems: kind.most, items: { type: ['string', 'number'] } };
      return { anyOf: [{ type: 'string' }, list] };
    }
    case 'column':
      return { anyOf: [{ type: 'string', minLength: 1 }, { type: 'integer', minimum: 0 }, { type: 'null' }] };
    case 'files':
      return {
        anyOf: [
          { type: 'string', minLength: 1 },
          { type: 'array', minItems: 1, items: { type: 'string' } },
        ],
      };
    case 'direction':
      return { anyOf: [{ type: 'string' }, { type: 'array', minItems: 2, maxItems: 3, items: { type: 'number' } }] };
    case 'points':
      return { anyOf: [{ type: 'string' }, rowsForm(4)] };
    case 'bodies':
      return {
        anyOf: [{ type: 'string' }, bodyForm(), { type: 'array', items: { anyOf: [{ type: 'string' }, bodyForm()] } }],
      };
    case 'notes':
      return { type: 'object', additionalProperties: { type: ['string', 'number', 'boolean', 'null'] } };
  }
}

function rowsForm(width: number): JsonForm {
  return {
    type: 'array',
    minItems: 3,
    items: { type: 'array', minItems: width, maxItems: width, items: { type: 'number' } },
  };
}

function bodyForm(): JsonForm {
  const centre = {
    anyOf: [{ type: 'string' }, { type: 'array', minItems: 2, maxItems: 2, items: { type: ['string', 'number'] } }],
  };
  const circle = {
    type: 'object',
    properties: { centre, diameter: { type: 'string', examples: [DIMENSION_WORDS.length.example] } },
    required: ['centre', 'diameter'],
    additionalProperties: false,
  };
  return {
    type: 'object',
    properties: { circle, polygon: { type: 'string', examples: ['0 0; 5 0; 5 5 mm'] } },
    minProperties: 1,
    maxProperties: 1,
    additionalProperties: false,
  };
}

function leaf(row: SettingRow): z.ZodType {
  return z
    .unknown()
    .superRefine((raw, context) => {
      try {
        readSetting(row, raw);
      } catch (error) {
        if (!(error instanceof SettingProblem)) throw error;
        context.addIssue({ code: 'custom', message: error.message });
      }
    })
    .meta({
      ...jsonForm(row.kind),
      description: `${row.help}. Takes ${expectedOf(row.kind)}. Option --${row.option}.`,
      ...(row.default === null ? {} : { default: row.default }),
    })
    .optional();
}

/** A setting, or a group of them by name. */
interface Group {
  readonly [name: string]: SettingRow | Group;
}

function isRow(entry: SettingRow | Group): entry is SettingRow {
  return typeof entry['key'] === 'string';
}

/** The table as nested groups, by the dots of its keys. */
export function settingTree(): Group {
  const root: Record<string, unknown> = {};
  for (const row of SETTING_TABLE) {
    const path = row.key.split('.');
    let at = root;
    for (const name of path.slice(0, -1)) {
      at[name] ??= {};
      at = at[name] as Record<string, unknown>;
    }
    at[path[path.length - 1]!] = row;
  }
  return root as Group;
}

function objectOf(group: Group): z.ZodType {
  const shape: Record<string, z.ZodType> = {};
  for (const [name, entry] of Object.entries(group))
    shape[name] = isRow(entry) ? leaf(entry) : objectOf(entry).optional();
  return z.strictObject(shape);
}

/** The schema of a run sheet, built from `SETTING_TABLE`: each leaf is judged by `readSetting`, unknown keys are refused. */
export function runSheetSchema(): z.ZodType {
  return objectOf(settingTree());
}
