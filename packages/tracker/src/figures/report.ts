import type { RunRecord } from '../store/run-record.js';
import { isPairs } from './image-pairs.js';
import { formatCount, formatDuration, formatNumber, formatQuantity, formatShare, formatUnit } from './number-format.js';
import type { ReportData } from './report-data.js';
import { reportFigures } from './report-figures.js';
import { REPORT_STYLE } from './report-style.js';
import { countsTable, inputsTable, setAsideTable, settingsTable, systematicTable, usedShare } from './report-tables.js';
import { escapeText } from './svg.js';

/** Caution for whoever stands beside the tunnel. Standard names from memory; no advice. */
export const LASER_CAUTION =
  "Light sheets from class 3B and class 4 lasers can injure eyes and skin, also by reflection from glass, water surface and tracers. Follow IEC 60825-1 (equipment classes) and IEC 60825-14 (user's guide) or the local rule (EU 2006/25/EC; in the US ANSI Z136.1), and your laser safety officer.";

/** What these figures are not. */
export const NO_CERTIFICATION =
  'These are measured flow quantities with their estimated errors. They are no certification of a structure, a vehicle or any safety-related part, and no design load.';

/**
 * report.html of a run: one self-contained page, printable, light and dark. Everything that came from files is
 * escaped; nothing is loaded from anywhere. Cost: a few passes over the grid.
 */
export function reportHtml(record: RunRecord, data: ReportData): string {
  const title = escapeText(record.run);
  return `<!doctype html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta name="viewport" content="width=device-width, initial-scale=1">
<meta name="color-scheme" content="light dark">
<title>${title} – Wakeloom</title>
<style>${REPORT_STYLE}</style>
</head>
<body>
<header>
<p class="kind">Wakeloom run report</p>
<h1>${title}</h1>
<p class="under">${escapeText(underLine(record))}</p>
${keyFigures(record)}
</header>
<main>
${warnings(record)}
<h2>Flow</h2>
<div class="plots">
${reportFigures(record, data)}
</div>
<h2>From rows to bins</h2>
${countsTable(record.counts, isPairs(record))}
<h2>Rows set aside</h2>
${setAsideTable(record.counts)}
<h2>What was assumed</h2>
${list(record.assumptions, 'Nothing beyond the settings below.')}
<h2>Systematic uncertainty</h2>
<p>Standard errors in the result files (<code>_se</code>) are of random origin and shrink with more samples. These do not:</p>
${systematicTable(record)}
<h2>Settings</h2>
${settingsTable(record)}
<h2>Inputs and notes</h2>
${inputsTable(record)}
${notes(record)}
<h2>Use with care</h2>
<p class="caution">${escapeText(NO_CERTIFICATION)}</p>
<p class="caution">${escapeText(LASER_CAUTION)}</p>
</main>
<footer>
<p>${escapeText(footLine(record))}<br>Content digest <code>${escapeText(record.digest.content)}</code></p>
</footer>
</body>
</html>
`;
}

function underLine(record: RunRecord): string {
  const { counts } = record;
  const files = record.inputs.length === 1 ? record.inputs[0]!.name : `${formatCount(record.inputs.length)} files`;
  return `${files} · ${formatCount(counts.detections)} detections in ${formatCount(counts.framesPresent)} frames`;
}

/** A key figure: name, value, unit, and a line on what it rests on. */
interface KeyFigure {
  readonly name: string;
  readonly value: string;
  readonly unit: string;
  readonly note: string;
}

/** The figures a person looks for first, each with its unit. Also what the command line prints. */
export function keyFigureList(record: RunRecord): KeyFigure[] {
  const { counts, figures } = record;
  const names = ['x', 'y', 'z'];
  const pairs = isPairs(record);
  const median = figures.medianPathlineSamples;
  const noise = figures.noise.filter((value) => Number.isFinite(value) && value >= 0);
  return [
    {
      name: 'Mean speed',
      value: formatNumber(figures.meanSpeed),
      unit: figures.velocityUnit,
      note: `standard error of one sample ${formatQuantity(figures.medianVelocitySe, figures.velocityUnit, 2)} (median)`,
    },
    {
      name: 'Peak speed',
      value: formatNumber(figures.peakSpeed),
      unit: figures.velocityUnit,
      note: 'in samples that passed the screening',
    },
    {
      name: 'Pathlines',
      value: formatCount(counts.pathlines),
      unit: '',
      note: pairs
        ? 'one sample each, from the two detections of a pair'
        : `median ${formatNumber(median)} ${median === 1 ? 'sample' : 'samples'}`,
    },
    {
      name: 'Samples',
      value: formatCount(counts.samples),
      unit: '',
      note: pairs
        ? `two detections each: ${formatShare(usedShare(counts, pairs))} of detections for linking`
        : `${formatShare(usedShare(counts, pairs))} of detections for linking`,
    },
    {
      name: 'Displacement ratio',
      value: formatNumber(figures.displacementRatio, 3),
      unit: '',
      note: `of the mean spacing; 95th percentile ${formatNumber(figures.displacementRatio95, 3)}`,
    },
    {
      name: 'Position noise',
      value: noise.map((value) => formatNumber(value, 2)).join(', '),
      unit: figures.lengthUnit,
      note: `${names.slice(0, noise.length).join(', ')}, standard deviation`,
    },
    { name: 'Bins filled', value: formatCount(counts.binsFilled), unit: '', note: `of ${formatCount(counts.bins)}` },
    {
      name: 'Samples in the grid',
      value: formatShare(counts.samples > 0 ? counts.samplesInGrid / counts.samples : Number.NaN),
      unit: '',
      note: 'the rest is flagged and kept in pathlines.nc',
    },
  ];
}

function keyFigures(record: RunRecord): string {
  // Values break between figures only: a unit, or the last letter of one, alone on a line says nothing.
  const tiles = keyFigureList(record).map(
    ({ name, value, unit, note }) =>
      `<div><dt>${escapeText(name)}</dt><dd>${escapeText(value)}${unit === '' ? '' : `\u00a0<small>${escapeText(formatUnit(unit))}</small>`}</dd><dd class="note">${escapeText(note)}</dd></div>`,
  );
  return `<dl class="figures">${tiles.join('\n')}</dl>`;
}

function warnings(record: RunRecord): string {
  if (record.warnings.length === 0) return '';
  return `<h2>Warnings</h2>\n<div class="warnings">${list(record.warnings, '')}</div>`;
}

function list(lines: readonly string[], none: string): string {
  if (lines.length === 0) return `<p>${escapeText(none)}</p>`;
  return `<ul class="plain">${lines.map((line) => `<li>${escapeText(line)}</li>`).join('')}</ul>`;
}

function notes(record: RunRecord): string {
  const given = Object.entries(record.notes).filter(([, value]) => value !== '');
  if (given.length === 0) return '';
  return `<ul class="plain">${given.map(([key, value]) => `<li>${escapeText(key)}: ${escapeText(value)}</li>`).join('')}</ul>`;
}

function footLine(record: RunRecord): string {
  const { clockTimes, host, program } = record;
  // Stages overlap (reading, linking and fitting stream into each other), so their seconds do not add up to the run.
  const total = (Date.parse(clockTimes.finished) - Date.parse(clockTimes.started)) / 1000;
  return `${program.name} ${program.version}, ${host.runtime} on ${host.platform}, finished ${clockTimes.finished}, ${formatDuration(total)} with ${host.threads} ${host.threads === 1 ? 'thread' : 'threads'}.`;
}
