/**
 * Why one setting was refused, worded `got X, expected Y`. Caught inside `run/` and joined with the others into
 * one `WakeloomError` that also says where each stands; it never leaves the library.
 */
export class SettingProblem extends Error {
  override readonly name = 'SettingProblem';
}

/** What was found, short enough for a message. */
export function describeFound(raw: unknown): string {
  if (raw === null || raw === undefined || raw === '') return 'nothing';
  if (Array.isArray(raw)) {
    const flat = raw.every((item) => item === null || typeof item !== 'object');
    return flat && raw.length > 0 && raw.length <= 6 ? `the list [${raw.join(', ')}]` : `a list of ${raw.length}`;
  }
  if (typeof raw === 'object') return `the keys ${Object.keys(raw).slice(0, 4).join(', ')}`;
  const text = String(raw);
  return JSON.stringify(text.length > 60 ? `${text.slice(0, 57)}...` : text);
}
