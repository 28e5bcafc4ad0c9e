import type { PathlinePreview } from '@wakeloom/tracker/workers/operation-table';
import { type PlotFrame, toCanvasX, toCanvasY } from './plot-frame.js';
import { type SpeedScale, speedStep } from './speed-scale.js';

/**
 * Draws pathlines as lines from sample to sample, each piece in the colour of the mean speed of its two ends, slow
 * ones first. One path a colour: a stroke a piece would be twenty times as slow. Returns the pieces drawn.
 */
export function drawPathlines(
  canvas: CanvasRenderingContext2D,
  preview: PathlinePreview,
  frame: PlotFrame,
  scale: SpeedScale,
): number {
  const { rowSize, x, y, speed } = preview;
  const paths = scale.colours.map(() => new Path2D());
  let pieces = 0;
  let row = 0;
  for (const size of rowSize) {
    const end = row + size;
    let before = -1;
    for (row++; row < end; row++) {
      const step = speedStep(scale, (speed[row - 1] + speed[row]) / 2);
      const path = paths[step];
      if (step !== before) path.moveTo(toCanvasX(frame, x[row - 1]), toCanvasY(frame, y[row - 1]));
      path.lineTo(toCanvasX(frame, x[row]), toCanvasY(frame, y[row]));
      before = step;
      pieces++;
    }
    row = end;
  }
  canvas.save();
  canvas.lineWidth = 1;
  canvas.lineJoin = 'round';
  canvas.globalAlpha = 0.85;
  paths.forEach((path, k) => {
    canvas.strokeStyle = scale.colours[k];
    canvas.stroke(path);
  });
  canvas.restore();
  return pieces;
}
