import type { GridShape } from '../eulerian/grid.js';
import type { Body } from '../run/settings.js';
import { type PlotBox, toX, toY } from './axes.js';
import { formatQuantity } from './number-format.js';
import { px, textAt } from './svg.js';
import { niceStep } from './ticks.js';

/** Picture distance between arrows. */
const SPACING = 25;

/**
 * Velocity arrows on a map, thinned to about one every 25 px, the longest (98 % quantile) 0.85 of their spacing long;
 * `key` is a reference arrow above the plot. Bins without velocity or inside a body get none.
 */
export function drawArrows(
  box: PlotBox,
  shape: GridShape,
  plane: number,
  arrows: { readonly u: ArrayLike<number>; readonly v: ArrayLike<number>; readonly unit: string },
  bodies: readonly Body[],
): { drawn: string; key: string } {
  const [nx, ny] = shape.count;
  const every = Math.max(1, Math.round((SPACING * nx) / box.width));
  const picked: { x: number; y: number; u: number; v: number }[] = [];
  for (let j = every >> 1; j < ny; j += every) {
    for (let i = every >> 1; i < nx; i += every) {
      const at = (plane * ny + j) * nx + i;
      const [u, v] = [arrows.u[at]!, arrows.v[at]!];
      const [x, y] = [shape.first[0] + i * shape.step[0], shape.first[1] + j * shape.step[1]];
      if (Number.isNaN(u + v) || bodies.some((body) => nearCircle(body, x, y))) continue;
      picked.push({ x: toX(box, x), y: toY(box, y), u, v });
    }
  }
  if (picked.length === 0) return { drawn: '', key: '' };
  const speeds = picked.map(({ u, v }) => Math.hypot(u, v)).sort((a, b) => a - b);
  const most = speeds[Math.floor(0.98 * (speeds.length - 1))]!;
  if (!(most > 0)) return { drawn: '', key: '' };
  const scale = (0.85 * every * box.width) / nx / most;
  const path = picked
    .map(({ x, y, u, v }) => arrow(x - (u * scale) / 2, y + (v * scale) / 2, u * scale, -v * scale))
    .join('');
  const drawn = `<path d="${path}" fill="none" stroke="#fff" stroke-opacity="0.55" stroke-width="2.6" stroke-linecap="round"/><path d="${path}" fill="none" stroke="#0d1b26" stroke-width="1.1" stroke-linecap="round" stroke-linejoin="round"/>`;
  const shown = niceStep(most / 2.5);
  const key = `<path d="${arrow(box.left, box.top - 14, shown * scale, 0)}" fill="none" stroke="currentColor" stroke-width="1.3" stroke-linecap="round"/>${textAt(box.left + shown * scale + 8, box.top - 9.5, formatQuantity(shown, arrows.unit, 3))}`;
  return { drawn, key };
}

/** Shaft and an open head of a third of the length, at most 6 px. */
function arrow(x: number, y: number, dx: number, dy: number): string {
  const length = Math.hypot(dx, dy);
  if (length < 0.5) return '';
  const head = Math.min(6, length / 3) / length;
  const [tipX, tipY] = [x + dx, y + dy];
  const side = (turn: number) =>
    `${px(tipX - head * (dx - turn * dy * 0.5))} ${px(tipY - head * (dy + turn * dx * 0.5))}`;
  return `M${px(x)} ${px(y)}L${px(tipX)} ${px(tipY)}M${side(1)}L${px(tipX)} ${px(tipY)}L${side(-1)}`;
}

function nearCircle(body: Body, x: number, y: number): boolean {
  return body.kind === 'circle' && Math.hypot(x - body.centre[0], y - body.centre[1]) <= body.diameter / 2;
}
