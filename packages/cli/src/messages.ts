import type { RunEvent } from '@wakeloom/tracker/core/context';
import { isWakeloomError } from '@wakeloom/tracker/core/errors';
import { isPairs } from '@wakeloom/tracker/figures/image-pairs';
import { formatCount, formatNumber, formatShare } from '@wakeloom/tracker/figures/number-format';
import { keyFigureList } from '@wakeloom/tracker/figures/report';
import { countLines } from '@wakeloom/tracker/figures/report-tables';
import type { RunRecord } from '@wakeloom/tracker/store/run-record';
import { plainText } from './plain-text.js';
import type { Terminal } from './terminal.js';

/** An error as a person reads it: one message; its stack only with WAKELOOM_DEBUG=1. */
export function errorText(error: unknown, terminal: Pick<Terminal, 'paint' | 'debug'>): string {
  const message = error instanceof Error ? error.message : String(error);
  const head = `${terminal.paint.bold(terminal.paint.red('error'))} ${message}`;
  if (terminal.debug) return `${head}\n${codeOf(error)}${error instanceof Error ? error.stack : ''}`;
  // An error without a code is a fault of the program itself: say how to learn more.
  return isWakeloomError(error) ? head : `${head}\nThis was not foreseen. WAKELOOM_DEBUG=1 shows where it happened.`;
}

function codeOf(error: unknown): string {
  return isWakeloomError(error) ? `code ${error.code} ${JSON.stringify(error.details ?? {})}\n` : '';
}

/** A warning or note that came up in the work; null for what only the log keeps. */
export function eventText(event: RunEvent, terminal: Pick<Terminal, 'paint'>): string | null {
  if (event.level === 'info') return null;
  const word = event.level === 'warning' ? terminal.paint.yellow('warning') : 'note';
  return plainText(`${word} ${event.message}`);
}

/**
 * What a person wants to know after a run: counts at each step, key figures with units, what was assumed. Warnings
 * that were said while the work went on are not said again; all of them stand in run.json and the report.
 */
export function summaryLines(record: RunRecord, alreadySaid: ReadonlySet<string> = new Set()): string[] {
  const { counts, figures } = record;
  const lines = [record.run, ''];
  for (const { name, count, share, of, inner } of countLines(counts, isPairs(record))) {
    // The steps stay; what took nothing away is left to the report.
    if (inner && count === 0) continue;
    const shown = share === null ? '' : `  ${formatShare(share)} ${of}`;
    lines.push(`${(inner ? `  ${shortName(name)}` : name).padEnd(34)}${formatCount(count).padStart(13)}${shown}`);
  }
  lines.push('');
  for (const { name, value, unit, note } of keyFigureList(record)) {
    // Bins and samples stand among the counts already.
    if (unit === '' && name !== 'Displacement ratio') continue;
    const shown = `${value}${unit === '' ? '' : ` ${unit}`}`;
    lines.push(`${name.padEnd(34)}${shown.padStart(13)}  ${note}`);
  }
  if (!isPairs(record))
    lines.push(
      `${'Pathline length, median'.padEnd(34)}${formatNumber(figures.medianPathlineSamples).padStart(13)}  samples`,
    );
  if (record.assumptions.length > 0) lines.push('', ...record.assumptions.map((line) => `assumed: ${line}`));
  const warnings = record.warnings.filter((line) => !alreadySaid.has(line));
  if (warnings.length > 0) lines.push('', ...warnings.map((line) => `warning: ${line}`));
  return lines.map(plainText);
}

/** `flagged off-fit: the measured ...` shortened to its first part; the report has the whole. */
function shortName(name: string): string {
  return name
    .split(':')[0]!
    .replace('in fragments shorter than the shortest pathline', 'in fragments that are too short');
}
