import { readdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { runSheetJsonSchema } from '@wakeloom/tracker/run/json-schema';
import { SETTING_TABLE } from '@wakeloom/tracker/run/options';
import { Ajv2020 } from 'ajv/dist/2020.js';
import { describe, expect, it } from 'vitest';
import { parse } from 'yaml';

const GOLDEN = join(import.meta.dirname, 'golden-sheets');
const validate = new Ajv2020({ strict: true, allowUnionTypes: true, allErrors: true }).compile(runSheetJsonSchema());

function read(path: string): unknown {
  return parse(readFileSync(join(GOLDEN, path), 'utf8')) as unknown;
}

describe('JSON Schema of the run sheet', () => {
  it('stands in data/ as generated', () => {
    const stored = readFileSync(join(import.meta.dirname, '../../data/run-sheet.schema.json'), 'utf8');
    expect(JSON.parse(stored)).toEqual(JSON.parse(JSON.stringify(runSheetJsonSchema())));
  });

  // Sheets that write `[812, 640] px` are no YAML for an editor; the others must pass.
  const plain = readdirSync(join(GOLDEN, 'good')).filter(
    (name) => !/\] (px|mm|cm)/.test(readFileSync(join(GOLDEN, 'good', name), 'utf8')),
  );
  it.each(plain)('passes good/%s', (name) => {
    expect(validate(read(`good/${name}`)), JSON.stringify(validate.errors)).toBe(true);
  });

  it('covers at least two good sheets', () => {
    expect(plain.length).toBeGreaterThanOrEqual(2);
  });

  it.each([
    'key-misspelt',
    'key-in-wrong-place',
    'choice-misspelt',
    'not-a-sheet',
    'several-at-once',
    'unit-missing',
    'circle-without-unit',
  ])('refuses bad/%s.yaml, which needs no knowledge of units', (name) => {
    expect(validate(read(`bad/${name}.yaml`))).toBe(false);
  });

  it('knows every setting, with a description and its default', () => {
    const schema = runSheetJsonSchema();
    for (const row of SETTING_TABLE) {
      let at = schema as Record<string, unknown>;
      for (const name of row.key.split('.')) {
        at = (at['properties'] as Record<string, Record<string, unknown>>)[name]!;
        expect(at, row.key).toBeDefined();
      }
      expect(at['description']).toContain(row.help);
      if (row.default !== null) expect(at['default']).toBe(row.default);
    }
  });
});
