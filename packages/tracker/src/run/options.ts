import { DUMP_SETTINGS } from './options-dump.js';
import { SCENE_SETTINGS } from './options-scene.js';
import { WORK_SETTINGS } from './options-work.js';
import type { SettingRow } from './setting-kinds.js';

/**
 * Every setting of a run, once. The run sheet's validation and its JSON Schema, the command's options and help,
 * the tables in the documentation and the records in run.json are all made from this list; a setting that is not
 * here does not exist. Order: as a person fills in a sheet.
 */
export const SETTING_TABLE: readonly SettingRow[] = [...DUMP_SETTINGS, ...SCENE_SETTINGS, ...WORK_SETTINGS];
