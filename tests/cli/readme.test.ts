import { existsSync, readFileSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import { SETTING_TABLE } from '@wakeloom/tracker/run/options';
import { readSetting } from '@wakeloom/tracker/run/read-setting';
import { resolveRun } from '@wakeloom/tracker/run/resolve';
import { parseRunSheet } from '@wakeloom/tracker/run/run-sheet';
import { describe, expect, it } from 'vitest';
import { DEMO } from '../../packages/cli/src/commands/demo.js';
import { EXPORT } from '../../packages/cli/src/commands/export.js';
import { PROCESS } from '../../packages/cli/src/commands/process.js';
import { givenSettings } from '../../packages/cli/src/options.js';
import { parseVerb, verbParser } from '../../packages/cli/src/verbs.js';

const root = fileURLToPath(new URL('../../', import.meta.url));
const readme = readFileSync(`${root}README.md`, 'utf8');
const verbs = [PROCESS, EXPORT, DEMO];

/** Words of a line as a shell splits them: blanks, double quotes. */
function shellWords(line: string): string[] {
  return (line.match(/"[^"]*"|[^\s"]+/g) ?? []).map((word) => word.replace(/^"|"$/g, ''));
}

/** Command lines of the README and of the verbs' own help, without redirections. */
const commands = [readme, ...verbs.map(({ usage }) => usage)]
  .flatMap((text) => [...text.matchAll(/^\s*(?:npx )?wakeloom ([a-z]+ .*)$/gm)].map(([, words]) => words!))
  .filter((words) => !/\[|\bDIR\b|\bVERB\b/.test(words))
  .map((words) => words.replace(/ > \S+$/, ''));

describe('the README', () => {
  it('holds commands to look at', () => {
    expect(commands.length).toBeGreaterThanOrEqual(12);
  });

  it.each(commands)('wakeloom %s: is understood', (line) => {
    const [name, ...words] = shellWords(line);
    const verb = verbs.find((candidate) => candidate.name === name);
    expect(verb, name).toBeDefined();
    const parsed = parseVerb(verbParser(verb!, { columns: 80 }), words);
    if (verb === PROCESS) {
      expect(parsed.words).toHaveLength(1);
      expect(Object.keys(givenSettings(parsed.args)).length).toBe(
        words.filter((word) => word.startsWith('--') && !/^--(out|replace|quiet)$/.test(word)).length,
      );
      expect(parsed.args['out']).toBeTypeOf('string');
    }
    if (verb === EXPORT) expect(parsed.words[1]).toMatch(/^(pathlines|grid)$/);
  });

  it('shows a run sheet that is valid', () => {
    const sheet = /```yaml\n([\s\S]*?)```/.exec(readme)![1]!;
    expect(parseRunSheet(sheet, 'README.md').values['run']).toBe('cylinder, 30 mm/s');
  });

  it('shows bodies, one of them a polygon, that a run sheet and options take alike', () => {
    const yaml = [...readme.matchAll(/```yaml\n([\s\S]*?)```/g)]
      .map(([, text]) => text!)
      .find((text) => text.startsWith('body'))!;
    const sheet = parseRunSheet(`geometry: { scale: 1 mm/px }\n${yaml}`, 'README.md');
    const body = [...readme.matchAll(/--body "([^"]+)"/g)].map(([, text]) => text!);
    expect(body).toHaveLength(2);
    const fromOptions = resolveRun({ options: { scale: '1 mm/px', body } }).settings.body;
    expect(resolveRun({ sheet }).settings.body).toEqual(fromOptions);
    expect(fromOptions.map(({ kind }) => kind)).toEqual(['circle', 'polygon']);
  });

  it('lists only settings that process takes as they stand there', () => {
    const table = /<!-- settings:begin -->([\s\S]*)<!-- settings:end -->/.exec(readme)![1]!;
    const rows = [...table.matchAll(/^\| `([a-z.-]+)` \| (.+?) \|/gm)].map(
      ([, key, option]) => [key!, option!] as const,
    );
    expect(rows.map(([key]) => key)).toEqual(SETTING_TABLE.map(({ key }) => key));
    for (const [key, option] of rows) {
      const row = SETTING_TABLE.find((candidate) => candidate.key === key)!;
      if (option === '(the words after `process`)') {
        expect(key).toBe('dump.files');
        continue;
      }
      const name = /^`(--[a-z-]+)`$/.exec(option)![1]!;
      const { args, words } = parseVerb(verbParser(PROCESS, { columns: 80 }), ['dump.csv', name, row.example]);
      expect(words).toEqual(['dump.csv']);
      const given = givenSettings(args);
      expect(Object.keys(given)).toEqual([name.slice(2)]);
      expect(readSetting(row, given[row.option]), key).not.toBeNull();
    }
  });

  it('lets repeatable settings be repeated', () => {
    const words = ['d.csv', '--notes', 'operator: Me', '--notes', 'facility: B', '--body', 'circle 0, 0, 5 mm'];
    const { args } = parseVerb(verbParser(PROCESS, { columns: 80 }), [...words, '--body', 'polygon 0 0; 5 0; 5 5 mm']);
    const { settings } = resolveRun({ options: { ...givenSettings(args), scale: '1 mm/px' } });
    expect(settings.notes).toEqual({ operator: 'Me', facility: 'B' });
    expect(settings.body).toHaveLength(2);
  });

  it('links to files that are there', () => {
    const links = [...readme.matchAll(/\]\((?!https?:)([^)#]+)\)/g)].map(([, path]) => path!);
    expect(links.length).toBeGreaterThan(0);
    for (const path of links) expect([path, existsSync(`${root}${path}`)]).toEqual([path, true]);
  });

  it('names every runtime package of the workspace with its version and licence', () => {
    for (const name of ['tracker', 'cli', 'web-viewer']) {
      const { dependencies } = JSON.parse(readFileSync(`${root}packages/${name}/package.json`, 'utf8')) as {
        dependencies: Record<string, string>;
      };
      for (const [dependency, version] of Object.entries(dependencies)) {
        if (version.startsWith('workspace:')) continue;
        expect(readme).toContain(`${dependency} ${version}`);
      }
    }
  });
});
