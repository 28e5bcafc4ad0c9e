import { px, textAt } from './svg.js';
import { niceTicks, type Ticks, tickLabel } from './ticks.js';

/** One axis: its range in data units and its label with the unit in it. */
export interface Axis {
  readonly low: number;
  readonly high: number;
  readonly label: string;
}

/** Where the data lie in the picture: y grows upward in data, downward in the picture. */
export interface PlotBox {
  readonly left: number;
  readonly top: number;
  readonly width: number;
  readonly height: number;
  readonly x: Axis;
  readonly y: Axis;
}

/** Picture x of a data x. */
export function toX(box: PlotBox, value: number): number {
  return box.left + ((value - box.x.low) / (box.x.high - box.x.low)) * box.width;
}

/** Picture y of a data y. */
export function toY(box: PlotBox, value: number): number {
  return box.top + box.height - ((value - box.y.low) / (box.y.high - box.y.low)) * box.height;
}

/** Axis lines, ticks, numbers, labels; with `grid` faint lines across the plot. */
export function drawAxes(box: PlotBox, grid: boolean): string {
  const bottom = box.top + box.height;
  const xTicks = niceTicks(box.x.low, box.x.high, Math.max(2, Math.round(box.width / 90)));
  const yTicks = niceTicks(box.y.low, box.y.high, Math.max(2, Math.round(box.height / 55)));
  const parts: string[] = [];
  const rules: string[] = [];
  const marks: string[] = [];
  for (const value of xTicks.values) {
    const x = toX(box, value);
    if (grid) rules.push(`M${px(x)} ${px(box.top)}V${px(bottom)}`);
    marks.push(`M${px(x)} ${px(bottom)}v5`);
    parts.push(textAt(x, bottom + 19, tickLabel(value, xTicks), 'text-anchor="middle"'));
  }
  for (const value of yTicks.values) {
    const y = toY(box, value);
    if (grid) rules.push(`M${px(box.left)} ${px(y)}H${px(box.left + box.width)}`);
    marks.push(`M${px(box.left)} ${px(y)}h-5`);
    parts.push(textAt(box.left - 9, y + 4.5, tickLabel(value, yTicks), 'text-anchor="end"'));
  }
  const labelX = box.left - 20 - widestLabel(yTicks) * 7.4;
  const middle = box.top + box.height / 2;
  parts.push(textAt(box.left + box.width / 2, bottom + 39, box.x.label, 'text-anchor="middle"'));
  parts.push(
    textAt(
      labelX,
      middle,
      box.y.label,
      `text-anchor="middle" transform="rotate(-90 ${px(labelX)} ${px(middle)})" dy="4"`,
    ),
  );
  const under =
    rules.length > 0 ? `<path d="${rules.join('')}" fill="none" stroke="currentColor" stroke-opacity="0.12"/>` : '';
  return `${under}<path d="${marks.join('')}" fill="none" stroke="currentColor" stroke-opacity="0.7"/>${parts.join('')}`;
}

/** Room left of the plot for numbers and label, so that neither is cut off. */
export function leftRoom(y: Axis, height: number): number {
  return 34 + widestLabel(niceTicks(y.low, y.high, Math.max(2, Math.round(height / 55)))) * 7.4;
}

/** Room below the plot. */
export const BOTTOM_ROOM = 50;

function widestLabel(ticks: Ticks): number {
  return ticks.values.reduce((most, value) => Math.max(most, tickLabel(value, ticks).length), 1);
}
