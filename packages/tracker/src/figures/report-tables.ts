import { FLAG, FLAG_MEANING, type FlagName } from '../core/columns.js';
import type { RunCounts, RunRecord } from '../store/run-record.js';
import { formatBytes, formatCount, formatNumber, formatShare, formatUnit } from './number-format.js';
import { escapeText } from './svg.js';

type Cell = string | { readonly number: string };

/** Table from cells that are escaped here; the first cell of a row is its heading. */
function table(head: readonly string[], rows: readonly { cells: readonly Cell[]; look?: string }[]): string {
  const numeric = rows[0]?.cells.map((cell) => typeof cell !== 'string') ?? [];
  const top = head.map((name, i) => `<th scope="col"${numeric[i] ? ' class="number"' : ''}>${escapeText(name)}</th>`);
  const body = rows.map(({ cells, look }) => {
    const tds = cells.map((cell, i) => {
      if (i === 0 && typeof cell === 'string') return `<th scope="row">${escapeText(cell)}</th>`;
      return typeof cell === 'string'
        ? `<td>${escapeText(cell)}</td>`
        : `<td class="number">${escapeText(cell.number)}</td>`;
    });
    return `<tr${look === undefined ? '' : ` class="${look}"`}>${tds.join('')}</tr>`;
  });
  return `<div class="scroll"><table><thead><tr>${top.join('')}</tr></thead><tbody>${body.join('')}</tbody></table></div>`;
}

/**
 * Steps from the rows of the dump to the bins of the grid; `share` of the count the step starts from, null: none. With
 * image `pairs` a sample stands for two detections.
 */
export function countLines(
  counts: RunCounts,
  pairs = false,
): { name: string; count: number; share: number | null; of: string; inner: boolean }[] {
  const line = (name: string, count: number, whole: number | null = null, of = '', inner = false) => ({
    name,
    count,
    share: whole === null ? null : whole > 0 ? count / whole : Number.NaN,
    of,
    inner,
  });
  const setAside = counts.rowsSetAside.reduce((sum, { count }) => sum + count, 0);
  const frames = 'of frames from first to last';
  const linked = 'of detections for linking';
  const samples = 'of samples';
  return [
    line('Rows in the dump', counts.rowsPresent),
    line('rows set aside', setAside, counts.rowsPresent, 'of rows', true),
    line('Frames with detections', counts.framesPresent, counts.framesSpanned, frames),
    line('Detections', counts.detections),
    line('outside the region', counts.outsideRegion, counts.detections, 'of detections', true),
    line('inside a body', counts.insideBody, counts.detections, 'of detections', true),
    line('far away from the field', counts.farAway, counts.detections, 'of detections', true),
    line('Detections for linking', counts.detectionsForLinking),
    line(
      'in fragments shorter than the shortest pathline',
      counts.shortFragmentDetections,
      counts.detectionsForLinking,
      linked,
      true,
    ),
    line('not linked', counts.unlinkedDetections, counts.detectionsForLinking, linked, true),
    line('Links', counts.links),
    line('across missing frames', counts.linksBridging, counts.links, 'of links', true),
    line('left out for their risk', counts.linksLeftOutForRisk, null, '', true),
    line('Pathlines', counts.pathlines),
    pairs
      ? { ...line('Samples', counts.samples), share: usedShare(counts, pairs), of: `${linked}, two a sample` }
      : line('Samples', counts.samples, counts.detectionsForLinking, linked),
    ...Object.keys(FLAG).map((flag) =>
      line(
        `flagged ${flag}: ${FLAG_MEANING[flag as FlagName]}`,
        counts.flagged[flag] ?? 0,
        counts.samples,
        samples,
        true,
      ),
    ),
    line('Samples in the grid', counts.samplesInGrid, counts.samples, samples),
    line('Bins filled', counts.binsFilled, counts.bins, 'of bins'),
  ];
}

/** Share of the detections for linking that samples were made from; two each with image pairs. NaN without any. */
export function usedShare(counts: RunCounts, pairs: boolean): number {
  if (counts.detectionsForLinking === 0) return Number.NaN;
  return ((pairs ? 2 : 1) * counts.samples) / counts.detectionsForLinking;
}

/** What went in and came out at every step. */
export function countsTable(counts: RunCounts, pairs = false): string {
  const rows = countLines(counts, pairs).map(({ name, count, share, of, inner }) => ({
    cells: [name, { number: formatCount(count) }, { number: share === null ? '' : formatShare(share) }, of],
    look: inner ? 'step' : undefined,
  }));
  return table(['step', 'count', 'share', 'of what'], rows);
}

/** Rows set aside by reason with the first few of each, or a sentence that there were none. */
export function setAsideTable(counts: RunCounts): string {
  const rows = counts.rowsSetAside
    .filter(({ count }) => count > 0)
    .map(({ reason, count, examples }) => ({
      cells: [
        reason.replaceAll('-', ' '),
        { number: formatCount(count) },
        examples.map(({ file, line, found }) => `${file}${line > 0 ? `:${line}` : ''} "${found}"`).join('; '),
      ],
    }));
  return rows.length === 0 ? '<p>No row was set aside.</p>' : table(['reason', 'rows', 'the first few'], rows);
}

/** Every setting with unit and origin; those not at their default stand out. */
export function settingsTable(record: RunRecord): string {
  // What nobody set and has no default of its own would fill half the table with "none".
  const unset = record.settings.filter(({ value, origin }) => value === null && origin === 'default');
  const rows = record.settings
    .filter((setting) => !unset.includes(setting))
    .map(({ key, value, unit, origin }) => ({
      cells: [key, settingText(value), unit === null ? '' : formatUnit(unit), origin],
      look: origin === 'default' ? undefined : 'changed',
    }));
  const rest =
    unset.length === 0 ? '' : `<p class="quiet">Not set: ${escapeText(unset.map(({ key }) => key).join(', '))}.</p>`;
  return table(['setting', 'value', 'unit', 'from'], rows) + rest;
}

function settingText(value: RunRecord['settings'][number]['value']): string {
  if (value === null) return 'none';
  if (Array.isArray(value)) return value.map((one) => settingText(one as string | number)).join(', ');
  if (typeof value === 'number')
    return formatNumber(Number(value.toPrecision(6))).length > 8
      ? formatNumber(value, 6)
      : String(Number(value.toPrecision(6)));
  return String(value);
}

/** Uncertainties that more samples do not make smaller. */
export function systematicTable(record: RunRecord): string {
  if (record.systematic.length === 0) {
    return '<p>None was stated. Scale, frame rate, origin and angle count as exact: give their standard uncertainties in the run sheet (<code>0.0500 +- 0.0002 mm/px</code>) to see them here.</p>';
  }
  const rows = record.systematic.map(({ source, standardUncertainty, unit, effect }) => ({
    cells: [source, { number: formatNumber(standardUncertainty, 2) }, formatUnit(unit), effect],
  }));
  return table(['source', 'standard uncertainty', 'unit', 'effect'], rows);
}

/** Input files with size, time and hash. */
export function inputsTable(record: RunRecord): string {
  // Hundreds of files (one a frame) would bury the report: run.json has all of them.
  const shown = record.inputs.slice(0, 12);
  const rows = shown.map(({ name, bytes, modified, sha256 }) => ({
    cells: [name, { number: formatBytes(bytes) }, modified ?? 'unknown', `${sha256.slice(0, 16)}…`],
  }));
  const rest = record.inputs.length - shown.length;
  return (
    table(['file', 'size', 'last changed', 'SHA-256'], rows) +
    (rest > 0 ? `<p>and ${formatCount(rest)} more, all in run.json.</p>` : '')
  );
}
