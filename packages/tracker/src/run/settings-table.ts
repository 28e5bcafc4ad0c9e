import { SETTING_TABLE } from './options.js';
import { expectedOf } from './read-setting.js';
import { isRepeatable } from './setting-kinds.js';

function cell(text: string): string {
  return text.replace(/\|/g, '\\|');
}

/** The table of all settings in Markdown, ending in a line feed; the README's copy is generated from it. */
export function settingsMarkdown(): string {
  const lines = ['| run sheet | option | takes | default | what |', '|---|---|---|---|---|'];
  for (const row of SETTING_TABLE) {
    const fallback = row.default === null ? '' : `\`${row.default}\``;
    const more = isRepeatable(row.kind) ? '; the option may be repeated' : '';
    // The dump is what stands after the verb.
    const option = row.kind.type === 'files' ? '(the words after `process`)' : `\`--${row.option}\``;
    const cells = [`\`${row.key}\``, option, `${expectedOf(row.kind)}${more}`, fallback, row.help];
    lines.push(`| ${cells.map(cell).join(' | ')} |`);
  }
  return `${lines.join('\n')}\n`;
}
