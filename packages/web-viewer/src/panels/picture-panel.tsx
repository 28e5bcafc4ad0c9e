import { formatCount, formatQuantity } from '@wakeloom/tracker/figures/number-format';
import type { PathlinePreview } from '@wakeloom/tracker/workers/operation-table';
import { useEffect, useRef } from 'preact/hooks';
import { drawAxes } from '../draw/draw-axes.js';
import { drawPathlines } from '../draw/draw-pathlines.js';
import { boundsOf, canvasHeight, fitFrame } from '../draw/plot-frame.js';
import { type SpeedScale, speedScale } from '../draw/speed-scale.js';
import { useDarkPage, useWidth } from './page-look.js';

interface PictureProps {
  readonly preview: PathlinePreview;
  readonly lengthUnit: string;
  readonly velocityUnit: string;
}

/** The pathlines of a run on a canvas, with axes in the run's unit and the colours' meaning. */
export function PicturePanel({ preview, lengthUnit, velocityUnit }: PictureProps) {
  const canvasRef = useRef<HTMLCanvasElement>(null);
  const [holderRef, width] = useWidth<HTMLElement>();
  const dark = useDarkPage();
  const scale = speedScale(preview.speed, dark);

  useEffect(() => {
    const canvas = canvasRef.current;
    if (canvas !== null && width > 0) paint(canvas, preview, width, lengthUnit, scale);
  }, [preview, width, dark]);

  const all = formatCount(preview.pathlines);
  const share =
    preview.stride === 1
      ? `All ${all} pathlines`
      : `One in ${preview.stride} of ${all} pathlines (${formatCount(preview.rowSize.length)})`;
  return (
    <figure ref={holderRef}>
      <canvas
        ref={canvasRef}
        role="img"
        aria-label={`Pathlines, coloured by speed from 0 to ${formatQuantity(scale.high, velocityUnit)}`}
      />
      <figcaption>
        <span class="ramp">
          <span>0</span>
          <span
            class="colours"
            aria-hidden="true"
            style={{ background: `linear-gradient(90deg, ${scale.colours.join(', ')})` }}
          />
          <span>{formatQuantity(scale.high, velocityUnit)}</span>
        </span>
        <span>{share}, coloured by speed; faster ones take the last colour</span>
      </figcaption>
    </figure>
  );
}

function paint(
  canvas: HTMLCanvasElement,
  preview: PathlinePreview,
  width: number,
  lengthUnit: string,
  scale: SpeedScale,
): void {
  const bounds = boundsOf(preview.x, preview.y);
  const context = canvas.getContext('2d');
  if (bounds === null || context === null) return;
  const frame = fitFrame(bounds, width, Math.max(320, 0.72 * window.innerHeight));
  const height = canvasHeight(frame);
  const density = window.devicePixelRatio || 1;
  canvas.width = Math.round(width * density);
  canvas.height = Math.round(height * density);
  canvas.style.width = `${width}px`;
  canvas.style.height = `${height}px`;
  context.scale(density, density);
  const style = getComputedStyle(canvas);
  const colour = (name: string) => style.getPropertyValue(name).trim();
  const pieces = drawPathlines(context, preview, frame, scale);
  drawAxes(context, frame, lengthUnit, {
    ink: colour('--ink'),
    soft: colour('--soft'),
    rule: colour('--rule'),
    font: `13px ${style.fontFamily}`,
  });
  // For those who test the picture: how many pieces of line it holds.
  canvas.dataset['pieces'] = String(pieces);
}
