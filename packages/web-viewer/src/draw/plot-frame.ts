/** Bounds of what is drawn, in data units. */
export interface Bounds {
  readonly left: number;
  readonly right: number;
  readonly bottom: number;
  readonly top: number;
}

/** A plot with one scale for both axes: where its data rectangle lies on the canvas, in CSS px, y down. */
export interface PlotFrame {
  readonly bounds: Bounds;
  readonly left: number;
  readonly top: number;
  readonly width: number;
  readonly height: number;
  /** CSS px per data unit. */
  readonly scale: number;
}

/** Room beside the data rectangle for tick labels and axis names, CSS px. */
export const MARGIN = { left: 62, right: 14, top: 12, bottom: 46 } as const;

/** Bounds of points, widened where they are flat; null without any. */
export function boundsOf(x: Float32Array, y: Float32Array): Bounds | null {
  let left = Number.POSITIVE_INFINITY;
  let right = Number.NEGATIVE_INFINITY;
  let bottom = Number.POSITIVE_INFINITY;
  let top = Number.NEGATIVE_INFINITY;
  for (let i = 0; i < x.length; i++) {
    if (x[i] < left) left = x[i];
    if (x[i] > right) right = x[i];
    if (y[i] < bottom) bottom = y[i];
    if (y[i] > top) top = y[i];
  }
  if (!(left <= right && bottom <= top)) return null;
  const least = 1e-3 * Math.max(right - left, top - bottom) || 1;
  const wider = (low: number, high: number) =>
    high - low >= least ? [low, high] : [(low + high - least) / 2, (low + high + least) / 2];
  [left, right] = wider(left, right);
  [bottom, top] = wider(bottom, top);
  return { left, right, bottom, top };
}

/** The largest frame with equal scales that fits the width and keeps the canvas at most `maxHeight` high. */
export function fitFrame(bounds: Bounds, canvasWidth: number, maxHeight: number): PlotFrame {
  const room = Math.max(40, canvasWidth - MARGIN.left - MARGIN.right);
  const roomHeight = Math.max(40, maxHeight - MARGIN.top - MARGIN.bottom);
  const spanX = bounds.right - bounds.left;
  const spanY = bounds.top - bounds.bottom;
  const scale = Math.min(room / spanX, roomHeight / spanY);
  const width = spanX * scale;
  return { bounds, left: MARGIN.left + (room - width) / 2, top: MARGIN.top, width, height: spanY * scale, scale };
}

/** Height of the canvas that holds the frame, CSS px. */
export function canvasHeight(frame: PlotFrame): number {
  return Math.ceil(frame.top + frame.height + MARGIN.bottom);
}

/** Canvas x of a data x. */
export function toCanvasX(frame: PlotFrame, x: number): number {
  return frame.left + (x - frame.bounds.left) * frame.scale;
}

/** Canvas y of a data y: data y points up, canvas y down. */
export function toCanvasY(frame: PlotFrame, y: number): number {
  return frame.top + (frame.bounds.top - y) * frame.scale;
}
