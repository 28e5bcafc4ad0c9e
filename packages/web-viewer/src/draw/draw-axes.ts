import { axisLabel } from '@wakeloom/tracker/figures/number-format';
import { niceTicks, tickLabel } from '@wakeloom/tracker/figures/ticks';
import { type PlotFrame, toCanvasX, toCanvasY } from './plot-frame.js';

/** Colours and type of a plot, from the page's style. */
export interface PlotTheme {
  readonly ink: string;
  readonly soft: string;
  readonly rule: string;
  readonly font: string;
}

/** Draws border, ticks with labels and axis names of a plot; lengths in `unit`. Pure but for the canvas. */
export function drawAxes(canvas: CanvasRenderingContext2D, frame: PlotFrame, unit: string, theme: PlotTheme): void {
  const { bounds, left, top, width, height } = frame;
  const bottom = top + height;
  canvas.save();
  canvas.font = theme.font;
  canvas.lineWidth = 1;
  canvas.strokeStyle = theme.rule;
  canvas.strokeRect(Math.round(left) + 0.5, Math.round(top) + 0.5, Math.round(width), Math.round(height));
  canvas.strokeStyle = theme.soft;
  canvas.fillStyle = theme.ink;

  canvas.textAlign = 'center';
  canvas.textBaseline = 'top';
  const xTicks = niceTicks(bounds.left, bounds.right, Math.max(4, Math.round(width / 90)));
  for (const value of xTicks.values) {
    const x = Math.round(toCanvasX(frame, value)) + 0.5;
    canvas.beginPath();
    canvas.moveTo(x, bottom);
    canvas.lineTo(x, bottom + 5);
    canvas.stroke();
    canvas.fillText(tickLabel(value, xTicks), x, bottom + 8);
  }
  canvas.textAlign = 'right';
  canvas.textBaseline = 'middle';
  const yTicks = niceTicks(bounds.bottom, bounds.top, Math.max(3, Math.round(height / 60)));
  for (const value of yTicks.values) {
    const y = Math.round(toCanvasY(frame, value)) + 0.5;
    canvas.beginPath();
    canvas.moveTo(left - 5, y);
    canvas.lineTo(left, y);
    canvas.stroke();
    canvas.fillText(tickLabel(value, yTicks), left - 8, y);
  }

  canvas.fillStyle = theme.soft;
  canvas.textAlign = 'center';
  canvas.textBaseline = 'bottom';
  canvas.fillText(axisLabel('x', unit), left + width / 2, bottom + 44);
  canvas.translate(left - 50, top + height / 2);
  canvas.rotate(-Math.PI / 2);
  canvas.textBaseline = 'middle';
  canvas.fillText(axisLabel('y', unit), 0, 0);
  canvas.restore();
}
