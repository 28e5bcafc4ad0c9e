import { type Axis, BOTTOM_ROOM, drawAxes, leftRoom, type PlotBox, toX, toY } from './axes.js';
import { ACCENT, type FigureTexts, px, svgRoot, textAt } from './svg.js';

/** One quantity over another: x ascending. */
export interface Series {
  readonly x: ArrayLike<number>;
  readonly y: ArrayLike<number>;
}

/** How the plot is called and what it covers. */
export interface LinePlotOptions extends FigureTexts {
  readonly xLabel: string;
  readonly yLabel: string;
  /** Let the y axis start at zero (default true): a small wobble then looks small. */
  readonly fromZero?: boolean;
  readonly width?: number;
  readonly height?: number;
}

/**
 * A line as an SVG text. More points than pixel columns are drawn as the band from the least to the greatest of each
 * column, so that no outlier is lost. Gaps (NaN) break the line.
 */
export function linePlotSvg(series: Series, options: LinePlotOptions): string {
  const width = options.width ?? 560;
  const height = options.height ?? 300;
  const top = 22;
  const range = extent(series.y, options.fromZero ?? true);
  const y: Axis = { low: range[0], high: range[1], label: options.yLabel };
  const left = leftRoom(y, height - top - BOTTOM_ROOM);
  const count = series.x.length;
  const first = count > 0 ? series.x[0]! : 0;
  const last = count > 0 ? series.x[count - 1]! : 1;
  const box: PlotBox = {
    left,
    top,
    width: width - left - 16,
    height: height - top - BOTTOM_ROOM,
    x: { low: first, high: last > first ? last : first + 1, label: options.xLabel },
    y,
  };
  if (count === 0) {
    const words = textAt(box.left + box.width / 2, box.top + box.height / 2, 'nothing to show', 'text-anchor="middle"');
    return svgRoot(width, height, options, drawAxes(box, true) + words);
  }
  const body = count > 2 * box.width ? drawBand(box, series) : drawLine(box, series);
  return svgRoot(width, height, options, drawAxes(box, true) + body);
}

function drawLine(box: PlotBox, series: Series): string {
  let path = '';
  let pen = false;
  for (let i = 0; i < series.x.length; i++) {
    const value = series.y[i]!;
    if (Number.isNaN(value)) {
      pen = false;
      continue;
    }
    path += `${pen ? 'L' : 'M'}${px(toX(box, series.x[i]!))} ${px(toY(box, value))}`;
    pen = true;
  }
  return `<path d="${path}" fill="none" stroke="${ACCENT}" stroke-width="1.6" stroke-linejoin="round" stroke-linecap="round"/>`;
}

function drawBand(box: PlotBox, series: Series): string {
  const columns = Math.floor(box.width);
  const least = new Float64Array(columns).fill(Number.POSITIVE_INFINITY);
  const most = new Float64Array(columns).fill(Number.NEGATIVE_INFINITY);
  for (let i = 0; i < series.x.length; i++) {
    const value = series.y[i]!;
    if (Number.isNaN(value)) continue;
    const column = Math.min(columns - 1, Math.max(0, Math.floor(toX(box, series.x[i]!) - box.left)));
    least[column] = Math.min(least[column]!, value);
    most[column] = Math.max(most[column]!, value);
  }
  let path = '';
  for (let column = 0; column < columns; column++) {
    if (most[column]! < least[column]!) continue;
    // At least one unit high, or a constant stretch would vanish.
    const from = toY(box, least[column]!) + 0.6;
    const to = toY(box, most[column]!) - 0.6;
    path += `M${px(box.left + column)} ${px(from)}V${px(to)}h1V${px(from)}z`;
  }
  return `<path d="${path}" fill="${ACCENT}"/>`;
}

function extent(values: ArrayLike<number>, fromZero: boolean): [number, number] {
  let low = fromZero ? 0 : Number.POSITIVE_INFINITY;
  let high = fromZero ? 0 : Number.NEGATIVE_INFINITY;
  for (let i = 0; i < values.length; i++) {
    const value = values[i]!;
    if (value < low) low = value;
    if (value > high) high = value;
  }
  if (!(high > low)) return Number.isFinite(low) ? [low, low + 1] : [0, 1];
  const room = 0.05 * (high - low);
  return [fromZero && low === 0 ? 0 : low - room, high + room];
}
