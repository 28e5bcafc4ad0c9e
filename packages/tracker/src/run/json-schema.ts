import { z } from 'zod';
import { runSheetSchema } from './sheet-schema.js';

/**
 * JSON Schema (draft 2020-12) of the run sheet, for editors: keys, what each takes, its default, one line of help.
 * It does not judge units; `parseRunSheet` does. New object on each call.
 */
export function runSheetJsonSchema(): Readonly<Record<string, unknown>> {
  const schema = z.toJSONSchema(runSheetSchema(), { target: 'draft-2020-12', io: 'input' });
  return { ...schema, title: 'Wakeloom run sheet', description: 'Describes one recording and how it is processed.' };
}
