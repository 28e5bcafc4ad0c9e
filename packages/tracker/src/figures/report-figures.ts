import type { RunRecord } from '../store/run-record.js';
import { fieldMapSvg } from './field-map.js';
import { gatherCounts, histogramSvg } from './histogram.js';
import { isPairs } from './image-pairs.js';
import { linePlotSvg } from './line-plot.js';
import { formatCount, formatNumber, formatQuantity } from './number-format.js';
import { fluctuationEnergy, fullestPlane, type ReportData, rangeOf, speedOf, zerosEmpty } from './report-data.js';
import { escapeText } from './svg.js';

/** The pictures of a report, as HTML `figure` elements. A picture whose data are missing is left out. */
export function reportFigures(record: RunRecord, data: ReportData): string {
  return [
    speedMap(record, data),
    transverseMap(record, data),
    energyMap(record, data),
    samplesMap(record, data),
    detectionsPlot(data),
    // With image pairs every pathline is one sample long: nothing to draw.
    isPairs(record) ? '' : lengthHistogram(record, data),
  ].join('\n');
}

/** `figure` with its caption: bold name, then a sentence. */
function framed(svg: string, name: string, words: string, wide = false): string {
  return `<figure${wide ? ' class="wide"' : ''}>${svg}<figcaption><b>${escapeText(name)}.</b> ${escapeText(words)}</figcaption></figure>`;
}

function planeWords(record: RunRecord, data: ReportData, plane: number): string {
  const { shape } = data.grid;
  if (shape.dims === 2) return '';
  const z = shape.first[2] + plane * shape.step[2];
  return ` Shown: plane z = ${formatQuantity(z, record.figures.lengthUnit)}, ${ordinal(plane + 1)} of ${shape.count[2]}.`;
}

function ordinal(number: number): string {
  const teens = number % 100 >= 11 && number % 100 <= 13;
  const ending = teens ? undefined : ['st', 'nd', 'rd'][(number % 10) - 1];
  return `${number}${ending ?? 'th'}`;
}

function speedMap(record: RunRecord, data: ReportData): string {
  const [u, v] = [data.grid.fields.get('u'), data.grid.fields.get('v')];
  if (u === undefined || v === undefined) return '';
  const values = speedOf(data.grid);
  const range = rangeOf(values);
  const plane = fullestPlane(data.grid);
  const words = `Speed of the mean velocity, ${formatNumber(range.least, 3)} to ${formatQuantity(range.most, u.unit, 3)} over ${formatCount(range.finite)} of ${formatCount(values.length)} bins. Arrows: mean velocity in the plane. Hatched bins hold too few samples for a mean and stay empty.${planeWords(record, data, plane)}`;
  const svg = fieldMapSvg(data.grid, {
    title: 'Mean speed',
    description: words,
    values,
    quantity: 'speed',
    unit: u.unit,
    lengthUnit: record.figures.lengthUnit,
    colours: 'low-to-high',
    plane,
    bodies: data.bodies,
    arrows: { u: u.values, v: v.values, unit: u.unit },
    plotWidth: 760,
    plotHeight: 560,
  });
  return framed(svg, 'Mean speed', words, true);
}

function transverseMap(record: RunRecord, data: ReportData): string {
  const v = data.grid.fields.get('v');
  if (v === undefined) return '';
  const range = rangeOf(v.values);
  const plane = fullestPlane(data.grid);
  const words = `v, positive upward (+y), ${formatNumber(range.least, 3)} to ${formatQuantity(range.most, v.unit, 3)}.${planeWords(record, data, plane)}`;
  const svg = fieldMapSvg(data.grid, {
    title: 'Mean transverse velocity',
    description: words,
    values: v.values,
    quantity: 'v',
    unit: v.unit,
    lengthUnit: record.figures.lengthUnit,
    colours: 'signed',
    plane,
    bodies: data.bodies,
    plotWidth: 400,
    plotHeight: 400,
  });
  return framed(svg, 'Mean transverse velocity', words);
}

function energyMap(record: RunRecord, data: ReportData): string {
  const energy = fluctuationEnergy(data.grid);
  if (energy === null) return '';
  const { values, unit, name, formula } = energy;
  const range = rangeOf(values);
  const plane = fullestPlane(data.grid);
  const needed = record.settings.find(({ key }) => key === 'grid.fewest-for-stress')?.value;
  const rule = typeof needed === 'number' ? `; the others hold fewer than ${formatCount(needed)} samples` : '';
  const found =
    range.finite === 0
      ? 'no bin has enough samples'
      : `${formatNumber(range.least, 3)} to ${formatQuantity(range.most, unit, 3)}`;
  const words = `Fluctuations per unit mass, ${formula}: ${found}. Reynolds stresses in ${formatCount(range.finite)} of ${formatCount(values.length)} bins${range.finite < values.length ? rule : ''}.${planeWords(record, data, plane)}`;
  const svg = fieldMapSvg(data.grid, {
    title: name,
    description: words,
    values,
    quantity: 'energy',
    unit,
    lengthUnit: record.figures.lengthUnit,
    colours: 'low-to-high',
    plane,
    bodies: data.bodies,
    plotWidth: 400,
    plotHeight: 400,
  });
  return framed(svg, name, words);
}

function samplesMap(record: RunRecord, data: ReportData): string {
  const values = zerosEmpty(data.grid.samples);
  const range = rangeOf(values);
  const plane = fullestPlane(data.grid);
  const words = `${formatNumber(range.least, 3)} to ${formatNumber(range.most, 5)}, mean ${formatNumber(range.mean, 3)} in bins that hold any; bin ${binWords(record, data)}.${planeWords(record, data, plane)}`;
  const svg = fieldMapSvg(data.grid, {
    title: 'Samples per bin',
    description: words,
    values,
    quantity: 'samples',
    unit: '1',
    lengthUnit: record.figures.lengthUnit,
    colours: 'low-to-high',
    plane,
    bodies: data.bodies,
    plotWidth: 400,
    plotHeight: 400,
  });
  return framed(svg, 'Samples per bin', words);
}

function binWords(record: RunRecord, data: ReportData): string {
  const size = data.grid.shape.size.slice(0, data.grid.shape.dims).map((edge) => formatNumber(edge, 3));
  return `${size.join(' × ')} ${record.figures.lengthUnit}`;
}

function detectionsPlot(data: ReportData): string {
  const { frame, detections } = data.detectionsPerFrame;
  const range = rangeOf(detections);
  const words = `${formatNumber(range.least, 6)} to ${formatNumber(range.most, 6)}, mean ${formatNumber(range.mean, 4)}, in ${formatCount(frame.length)} frames. A drift or a drop points to seeding, light or camera.`;
  const svg = linePlotSvg(
    { x: frame, y: detections },
    { title: 'Detections over frames', description: words, xLabel: 'frame', yLabel: 'detections' },
  );
  return framed(svg, 'Detections over frames', words);
}

function lengthHistogram(record: RunRecord, data: ReportData): string {
  const bars = gatherCounts(data.pathlinesBySamples);
  const median = record.figures.medianPathlineSamples;
  const words = `${formatCount(record.counts.pathlines)} pathlines, median ${formatNumber(median)} ${median === 1 ? 'sample' : 'samples'}, longest ${formatCount(Math.max(0, data.pathlinesBySamples.length - 1))}.`;
  const svg = histogramSvg(bars, {
    title: 'Lengths of pathlines',
    description: words,
    xLabel: 'samples of a pathline',
    yLabel: 'pathlines',
    mark: { value: median, name: `median ${formatNumber(median)}` },
  });
  return framed(svg, 'Lengths of pathlines', words);
}
