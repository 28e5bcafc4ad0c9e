import type { GridResult, GridShape } from '../eulerian/grid.js';
import type { Body } from '../run/settings.js';
import { type Axis, BOTTOM_ROOM, drawAxes, leftRoom, type PlotBox, toX, toY } from './axes.js';
import { COLOURS, type ColourMap, colourHex, colourIndex, DIVERGING, SEQUENTIAL } from './colour-map.js';
import { drawArrows } from './field-arrows.js';
import { axisLabel } from './number-format.js';
import { dataUri, palettePng } from './palette-png.js';
import { type FigureTexts, figureId, px, svgRoot, textAt } from './svg.js';
import { niceTicks, tickLabel } from './ticks.js';

/** What to draw of a grid. */
export interface FieldMapOptions extends FigureTexts {
  /** One value a bin, x fastest, whole grid; NaN bins are drawn as plainly empty. Borrowed. */
  readonly values: ArrayLike<number>;
  /** Name and unit at the colour bar. */
  readonly quantity: string;
  readonly unit: string;
  readonly lengthUnit: string;
  /** `signed` centres the colours on zero. */
  readonly colours: 'low-to-high' | 'signed';
  /** Range of the colours; without it from the data, see `colourRange`. */
  readonly range?: readonly [number, number];
  /** Bin index along z of the plane shown (3-D grids). */
  readonly plane?: number;
  readonly bodies?: readonly Body[];
  /** Velocity arrows over the map. */
  readonly arrows?: { readonly u: ArrayLike<number>; readonly v: ArrayLike<number>; readonly unit: string };
  /** Largest size of the plot itself. */
  readonly plotWidth?: number;
  readonly plotHeight?: number;
}

const BAR_WIDTH = 16;

/**
 * Heat map of one plane of a grid as an SVG text: axes in real units, equal aspect, colour bar with unit, bodies
 * outlined, empty bins hatched. With overlapping bins each is drawn over the step between centres. Cost: one pass over
 * the plane.
 */
export function fieldMapSvg(grid: Pick<GridResult, 'shape'>, options: FieldMapOptions): string {
  const { shape } = grid;
  const plane = options.plane ?? 0;
  const [low, high] = options.range ?? colourRange(planeValues(shape, options.values, plane), options.colours);
  const map = options.colours === 'signed' ? DIVERGING : SEQUENTIAL;
  const box = plotBox(shape, options);
  const ids = {
    hatch: figureId(options.title, 'hatch'),
    bar: figureId(options.title, 'bar'),
    clip: figureId(options.title, 'clip'),
  };
  const picture = heatPicture(shape, options.values, plane, low, high, map);
  const frame = `x="${px(box.left)}" y="${px(box.top)}" width="${px(box.width)}" height="${px(box.height)}"`;
  const arrows =
    options.arrows === undefined
      ? { drawn: '', key: '' }
      : drawArrows(box, shape, plane, options.arrows, options.bodies ?? []);
  const body = [
    `<defs><pattern id="${ids.hatch}" width="6" height="6" patternUnits="userSpaceOnUse" patternTransform="rotate(45)"><path d="M0 0V6" stroke="currentColor" stroke-opacity="0.28" stroke-width="1.5"/></pattern>${barGradient(ids.bar, map)}<clipPath id="${ids.clip}"><rect ${frame}/></clipPath></defs>`,
    picture.empty > 0 ? `<rect ${frame} fill="url(#${ids.hatch})"/>` : '',
    `<image ${frame} preserveAspectRatio="none" style="image-rendering:pixelated" href="${picture.uri}"/>`,
    `<g clip-path="url(#${ids.clip})">${arrows.drawn}${drawBodies(box, options.bodies ?? [])}</g>`,
    `<rect ${frame} fill="none" stroke="currentColor" stroke-opacity="0.7"/>`,
    drawAxes(box, false),
    drawBar(box, ids.bar, low, high, picture.beyond, options),
    picture.empty > 0 ? emptyKey(box, ids.hatch) : '',
    arrows.key,
  ].join('');
  const barHeight = Math.max(box.height, MIN_BAR);
  return svgRoot(
    box.left + box.width + 104,
    box.top + Math.max(box.height + BOTTOM_ROOM, barHeight + 12),
    options,
    body,
  );
}

/** Shortest colour bar that still holds a few ticks. */
const MIN_BAR = 120;

/**
 * Range of colours that a few wild bins do not spoil: from the 0.5 % to the 99.5 % quantile (nearest rank), or the
 * same distance on both sides of zero for signed values. Common practice, no source. [0, 1] when nothing is finite.
 */
export function colourRange(values: ArrayLike<number>, colours: FieldMapOptions['colours']): [number, number] {
  const finite = Float64Array.from({ length: values.length }, (_, i) => values[i]!)
    .filter(Number.isFinite)
    .sort();
  if (finite.length === 0) return [0, 1];
  const low = finite[Math.floor(0.005 * (finite.length - 1))]!;
  const high = finite[Math.ceil(0.995 * (finite.length - 1))]!;
  if (colours === 'signed') {
    const most = Math.max(Math.abs(low), Math.abs(high));
    return most > 0 ? [-most, most] : [-1, 1];
  }
  if (high > low) return [low, high];
  return [low, low + (low !== 0 ? Math.abs(low) * 0.1 : 1)];
}

/** Values of one plane, x fastest. A view where the array allows it, else a copy. */
function planeValues(shape: GridShape, values: ArrayLike<number>, plane: number): ArrayLike<number> {
  const size = shape.count[0] * shape.count[1];
  return Array.prototype.slice.call(values, plane * size, (plane + 1) * size) as number[];
}

function plotBox(shape: GridShape, options: FieldMapOptions): PlotBox {
  const axis = (of: 0 | 1, name: string): Axis => ({
    low: shape.first[of] - shape.step[of] / 2,
    high: shape.first[of] + (shape.count[of] - 0.5) * shape.step[of],
    label: axisLabel(name, options.lengthUnit),
  });
  const x = axis(0, 'x');
  const y = axis(1, 'y');
  const scale = Math.min((options.plotWidth ?? 520) / (x.high - x.low), (options.plotHeight ?? 440) / (y.high - y.low));
  const width = scale * (x.high - x.low);
  const height = scale * (y.high - y.low);
  return { left: leftRoom(y, height), top: 30, width, height, x, y };
}

function heatPicture(
  shape: GridShape,
  values: ArrayLike<number>,
  plane: number,
  low: number,
  high: number,
  map: ColourMap,
): { uri: string; empty: number; beyond: { low: boolean; high: boolean } } {
  const [nx, ny] = shape.count;
  const pixels = new Uint8Array(nx * ny);
  let empty = 0;
  const beyond = { low: false, high: false };
  for (let j = 0; j < ny; j++) {
    for (let i = 0; i < nx; i++) {
      const value = values[(plane * ny + j) * nx + i]!;
      const colour = colourIndex(value, low, high);
      // Row 0 of a picture is its top, that is the largest y.
      pixels[(ny - 1 - j) * nx + i] = colour + 1;
      if (colour < 0) empty++;
      else if (value < low) beyond.low = true;
      else if (value > high) beyond.high = true;
    }
  }
  return { uri: dataUri(palettePng(nx, ny, pixels, map)), empty, beyond };
}

/** Bodies cover the map: what little a bin at their rim averages must not look like flow inside them. */
function drawBodies(box: PlotBox, bodies: readonly Body[]): string {
  const look = 'fill="#7d8993" stroke="#1c2733" stroke-width="1.5"';
  const pxPerLength = box.width / (box.x.high - box.x.low);
  return bodies
    .map((body) => {
      if (body.kind === 'circle') {
        const [x, y] = body.centre;
        return `<circle cx="${px(toX(box, x))}" cy="${px(toY(box, y))}" r="${px((body.diameter / 2) * pxPerLength)}" ${look}/>`;
      }
      const corners = body.points.map(([x, y]) => `${px(toX(box, x))},${px(toY(box, y))}`).join(' ');
      return `<polygon points="${corners}" stroke-linejoin="round" ${look}/>`;
    })
    .join('');
}

function barGradient(id: string, map: ColourMap): string {
  const stops = Array.from({ length: 33 }, (_, i) => {
    const share = i / 32;
    return `<stop offset="${px(share * 100)}%" stop-color="${colourHex(map, Math.round(share * (COLOURS - 1)))}"/>`;
  });
  return `<linearGradient id="${id}" x1="0" y1="1" x2="0" y2="0">${stops.join('')}</linearGradient>`;
}

function drawBar(
  box: PlotBox,
  gradient: string,
  low: number,
  high: number,
  beyond: { low: boolean; high: boolean },
  options: FieldMapOptions,
): string {
  const x = box.left + box.width + 22;
  const height = Math.max(box.height, MIN_BAR);
  const ticks = niceTicks(low, high, Math.max(2, Math.round(height / 60)));
  const parts: string[] = [
    `<rect x="${px(x)}" y="${px(box.top)}" width="${BAR_WIDTH}" height="${px(height)}" fill="url(#${gradient})" stroke="currentColor" stroke-opacity="0.7"/>`,
  ];
  for (const value of ticks.values) {
    const y = box.top + height * (1 - (value - low) / (high - low));
    parts.push(`<path d="M${px(x + BAR_WIDTH)} ${px(y)}h5" stroke="currentColor" stroke-opacity="0.7"/>`);
    parts.push(textAt(x + BAR_WIDTH + 9, y + 4.5, tickLabel(value, ticks)));
  }
  // Pointed ends say that some bins lie beyond the range and are drawn in the end colour.
  const tip = (y: number, to: number) =>
    `<path d="M${px(x)} ${px(y)}h${BAR_WIDTH}l${-BAR_WIDTH / 2} ${to}z" stroke="currentColor" stroke-opacity="0.7" fill="${colourHex(options.colours === 'signed' ? DIVERGING : SEQUENTIAL, to < 0 ? COLOURS - 1 : 0)}"/>`;
  if (beyond.high) parts.push(tip(box.top, -8));
  if (beyond.low) parts.push(tip(box.top + height, 8));
  parts.push(
    textAt(box.left + box.width + 96, box.top - 14, axisLabel(options.quantity, options.unit), 'text-anchor="end"'),
  );
  return parts.join('');
}

function emptyKey(box: PlotBox, hatch: string): string {
  const y = box.top + box.height + 28;
  const x = box.left + box.width - 62;
  return `<rect x="${px(x)}" y="${px(y)}" width="14" height="12" fill="url(#${hatch})" stroke="currentColor" stroke-opacity="0.5"/>${textAt(x + 20, y + 10.5, 'empty')}`;
}
