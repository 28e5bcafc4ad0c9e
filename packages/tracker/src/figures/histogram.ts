import { type Axis, BOTTOM_ROOM, drawAxes, leftRoom, type PlotBox, toX, toY } from './axes.js';
import { ACCENT, type FigureTexts, px, svgRoot, textAt } from './svg.js';
import { niceStep } from './ticks.js';

/** Counts between edges: `counts[i]` of what lies in `edges[i] .. edges[i + 1]`. */
export interface Histogram {
  readonly edges: readonly number[];
  readonly counts: readonly number[];
}

/**
 * Gathers counts by whole number into bars of a round width, about `wanted` of them. `countsOf[k]` is how many
 * things have the number k (entry 0 included); empty ends are cut off.
 */
export function gatherCounts(countsOf: ArrayLike<number>, wanted = 40): Histogram {
  let first = 0;
  let last = countsOf.length - 1;
  while (first < countsOf.length && !countsOf[first]) first++;
  while (last >= first && !countsOf[last]) last--;
  if (last < first) return { edges: [], counts: [] };
  const width = Math.max(1, niceStep((last - first + 1) / wanted));
  const start = Math.floor(first / width) * width;
  const bars = Math.floor((last - start) / width) + 1;
  const counts = new Array<number>(bars).fill(0);
  for (let k = first; k <= last; k++) counts[Math.floor((k - start) / width)]! += countsOf[k]!;
  return { edges: Array.from({ length: bars + 1 }, (_, i) => start + i * width), counts };
}

/** What to draw and how it is called. */
export interface HistogramOptions extends FigureTexts {
  readonly xLabel: string;
  readonly yLabel: string;
  /** A value marked by an upright line with a name, such as the median. */
  readonly mark?: { readonly value: number; readonly name: string };
  readonly width?: number;
  readonly height?: number;
}

/** Bars as an SVG text. The count axis starts at zero; nothing to draw says so in words. */
export function histogramSvg(data: Histogram, options: HistogramOptions): string {
  const width = options.width ?? 560;
  const height = options.height ?? 300;
  const top = 22;
  const low = data.edges[0] ?? 0;
  const high = data.edges[data.edges.length - 1] ?? 1;
  const most = data.counts.reduce((a, b) => Math.max(a, b), 0);
  const y: Axis = { low: 0, high: most > 0 ? most * 1.05 : 1, label: options.yLabel };
  const left = leftRoom(y, height - top - BOTTOM_ROOM);
  const box: PlotBox = {
    left,
    top,
    width: width - left - 16,
    height: height - top - BOTTOM_ROOM,
    x: { low, high, label: options.xLabel },
    y,
  };
  if (most === 0) {
    const words = textAt(box.left + box.width / 2, box.top + box.height / 2, 'nothing to show', 'text-anchor="middle"');
    return svgRoot(width, height, options, drawAxes(box, true) + words);
  }
  const gap = box.width / data.counts.length > 6 ? 1 : 0;
  const bars = data.counts.map((count, i) => {
    if (count === 0) return '';
    const from = toX(box, data.edges[i]!) + gap / 2;
    const to = toX(box, data.edges[i + 1]!) - gap / 2;
    return `M${px(from)} ${px(box.top + box.height)}V${px(toY(box, count))}H${px(to)}V${px(box.top + box.height)}z`;
  });
  return svgRoot(
    width,
    height,
    options,
    `${drawAxes(box, true)}<path d="${bars.join('')}" fill="${ACCENT}"/>${drawMark(box, options.mark)}`,
  );
}

function drawMark(box: PlotBox, mark: HistogramOptions['mark']): string {
  if (mark === undefined || !(mark.value >= box.x.low && mark.value <= box.x.high)) return '';
  const x = toX(box, mark.value);
  const onTheLeft = x > box.left + box.width * 0.7;
  const words = textAt(x + (onTheLeft ? -6 : 6), box.top - 6, mark.name, onTheLeft ? 'text-anchor="end"' : '');
  return `<path d="M${px(x)} ${px(box.top - 14)}V${px(box.top + box.height)}" stroke="currentColor" stroke-width="1.5" stroke-dasharray="5 3" fill="none"/>${words}`;
}
