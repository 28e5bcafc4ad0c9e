import { SETTING_TABLE } from './options.js';
import { expectedOf } from './read-setting.js';

function cell(text: string): string {
  return text.replace(/\|/g, '\\|');
}

/** The table of all settings in Markdown, ending in a line feed; the README's copy is generated from it. */
export function settingsMarkdown(): string {
  const lines = ['| run sheet | option | takes | default | what |', '|---|---|---|---|---|'];
  for (const row of SETTING_TABLE) {
    const fallback = row.default === null ? '' : `\`${row.default}\``;
    const cells = [`\`${row.key}\``, `\`--${row.option}\``, expectedOf(row.kind), fallback, row.help];
    lines.push(`| ${cells.map(cell).join(' | ')} |`);
  }
  return `${lines.join('\n')}\n`;
}
