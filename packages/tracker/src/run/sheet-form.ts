/** Where something stands in a text, both counted from 1. */
export interface Place {
  readonly line: number;
  readonly column: number;
}

/** A run sheet that has passed validation on its own. Plain data: it may cross a worker border. */
export interface ParsedSheet {
  /** Name of the file for messages. */
  readonly name: string;
  /** What the sheet holds for each setting, by the dotted path of `SETTING_TABLE`, as written. */
  readonly values: Readonly<Record<string, unknown>>;
  /** Where each of those values stands. */
  readonly places: Readonly<Record<string, Place>>;
}
