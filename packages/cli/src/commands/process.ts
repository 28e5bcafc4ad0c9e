import { readFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { WakeloomError } from '@wakeloom/tracker/core/errors';
import { resolveRun } from '@wakeloom/tracker/run/resolve';
import { parseRunSheet } from '@wakeloom/tracker/run/run-sheet';
import type { OptionValue } from '@wakeloom/tracker/run/setting-kinds';
import type { ResolvedRun } from '@wakeloom/tracker/run/settings';
import { calledAs } from '../called-as.js';
import { differencesFrom, type EarlierRecord } from '../earlier-result.js';
import { EXIT } from '../exit-codes.js';
import { expandFiles } from '../files.js';
import { summaryLines } from '../messages.js';
import { addSettings, givenSettings, single } from '../options.js';
import { isOurResult, prepareOutFolder } from '../out-folder.js';
import { plainText } from '../plain-text.js';
import { processRun } from '../process-run.js';
import type { Terminal } from '../terminal.js';
import type { Args, Verb } from '../verbs.js';
import { longWork, typedWord } from './common.js';

/** Examples stand before the long list of settings, where they are seen. */
const USAGE = `wakeloom process DUMP.. [options] --out DIR
wakeloom process SHEET.yaml [options] --out DIR

Links the detections of a dump into pathlines and writes the result folder DIR.
Everything below can stand in a run sheet; an option overrules the sheet.
Several dump files are read in the order given; a quoted pattern such as
"frames/*.csv" stands for its files in the order of their numbers.

Examples:
  wakeloom demo --out demo
  wakeloom process demo/cylinder-wake.yaml --out demo/result
  wakeloom process demo/cylinder-wake.csv.gz --rate "60 Hz" --scale "0.05 mm/px" --bin "2 mm" --out demo/plain`;

/**
 * `process`: everything is checked before the work starts. The summary goes to stdout, since nothing else does and
 * people keep it; progress, notes and warnings go to stderr.
 */
export const PROCESS: Verb = {
  name: 'process',
  about: 'a dump in, a result folder out',
  usage: USAGE,
  options: (parser) =>
    addSettings(
      parser
        .option('out', { type: 'string', description: 'Folder for the result; made when missing' })
        .option('replace', {
          type: 'boolean',
          description: "Put the result in the place of another run's, or beside other files, which stay",
        })
        .option('quiet', { type: 'boolean', description: 'Say nothing but errors' }),
    ),
  run: runProcess,
};

async function runProcess(inputs: readonly string[], args: Args, terminal: Terminal): Promise<number> {
  const quiet = args['quiet'] === true;
  const { run, files } = resolveInputs(inputs, givenSettings(args));
  if (args['out'] === undefined) {
    throw new WakeloomError(
      'usage/no-out',
      '--out: got nothing, expected a folder for the result, such as --out results/run-1',
    );
  }
  const out = single('out', args['out'], 'a folder');
  const { earlier, undo } = await prepareOutFolder(out, args['replace'] === true, (record) =>
    differencesFrom(record, run, files),
  );
  if (!quiet && earlier !== null) {
    terminal.say(plainText(`note replaces the result of run ${earlier.run} once the new one is whole`));
  }
  const said = new Set<string>();
  const record = await longWork(terminal, quiet, (hooks) => {
    const onEvent: typeof hooks.onEvent = (event) => {
      said.add(event.message);
      hooks.onEvent(event);
    };
    return processRun({ run, files, out }, { ...hooks, onEvent });
  }).catch((error: unknown) => {
    undo();
    if (earlier !== null) terminal.say(earlierAfterFailure(out, earlier));
    throw error;
  });
  if (quiet) return EXIT.done;
  for (const line of [...summaryLines(record, said), ...nextSteps(out)]) terminal.result(line);
  return EXIT.done;
}

/** Whether the earlier result outlived a run that failed: it does unless the failure came while files changed names. */
function earlierAfterFailure(out: string, earlier: EarlierRecord): string {
  return plainText(
    isOurResult(out)
      ? `note ${out} still holds the complete earlier result of run ${earlier.run}`
      : `note ${out} holds no result any more: the new one was being put in the place of the earlier one`,
  );
}

/** Where the results lie and what to type next. */
export function nextSteps(out: string): string[] {
  const folder = typedWord(out);
  return [
    '',
    `Results in ${out}`,
    `  open ${join(out, 'report.html')} in a browser`,
    '',
    'Next:',
    `  ${calledAs()} export ${folder} pathlines --out pathlines.csv`,
    `  ${calledAs()} export ${folder} grid --format vtk --out grid.vti`,
  ];
}

/** Settings and dump files from what was typed: one run sheet, or dump files and globs. */
export function resolveInputs(
  inputs: readonly string[],
  options: Readonly<Record<string, OptionValue>>,
): { run: ResolvedRun; files: string[] } {
  if (inputs.length === 0) {
    throw new WakeloomError(
      'usage/no-input',
      'process: got no input, expected a dump or a run sheet: wakeloom process DUMP --out DIR',
    );
  }
  const sheets = inputs.filter(isSheet);
  if (sheets.length === 0) {
    // Settings first: a wrong option should not wait for a slow network folder.
    const run = resolveRun({ options, dumpFiles: inputs });
    return { run, files: expandFiles(inputs) };
  }
  if (inputs.length > 1) {
    throw new WakeloomError(
      'usage/inputs-mixed',
      `process: got ${inputs.length} inputs (${inputs.slice(0, 3).join(', ')}), expected one run sheet, or dump files without a run sheet`,
    );
  }
  const [name] = expandFiles(sheets);
  const sheet = parseRunSheet(readFileSync(name!, 'utf8'), name!);
  const run = resolveRun({ sheet, options });
  if (run.settings.dump.files.length === 0) {
    throw new WakeloomError(
      'sheet/no-dump',
      `${name}: got no dump files, expected dump.files, such as files: run-7.csv`,
    );
  }
  // Paths in a sheet count from the sheet, so that a folder with both can be moved.
  return { run, files: expandFiles(run.settings.dump.files, dirname(name!)) };
}

function isSheet(path: string): boolean {
  return /\.ya?ml$/i.test(path);
}
