import type { DetectionBlock, FrameIndex } from '../core/columns.js';
import type { RunContext } from '../core/context.js';
import { WakeloomError } from '../core/errors.js';
import { inConvexHull } from '../math/convex-hull.js';
import type { RunSettings } from '../run/settings.js';
import { type InsideTest, insideBodies } from './bodies.js';
import { createFrameSorter } from './canonical-order.js';
import { frameTimes } from './clock.js';
import { fitControlPoints } from './control-points.js';
import type { DumpScan } from './dump.js';
import { type CoordinateMap, scaleMap } from './geometry.js';
import { type RegionBounds, regionBounds } from './region.js';

export { bodyDistance } from './bodies.js';
export { calibrationSummary } from './calibration-summary.js';
export { frameTimes } from './clock.js';

/** What `calibrate` counts while it streams. Plain numbers, final once the stream has ended. */
export interface CalibrationTally {
  /** Detections that came in. */
  detections: number;
  /** Left out: outside the region of interest, or where the map gives no finite place (beyond its horizon). */
  outsideRegion: number;
  /** Left out: inside a body. */
  insideBody: number;
  /** Kept, but outside the convex hull of the control points, where the map is extrapolated. */
  outsideHull: number;
}

/** A tally of zeros. */
export function newTally(): CalibrationTally {
  return { detections: 0, outsideRegion: 0, insideBody: 0, outsideHull: 0 };
}

/** What `calibrate` is handed. */
export interface CalibrateInput {
  readonly settings: RunSettings;
  readonly scan: DumpScan;
  readonly context: RunContext;
  readonly tally: CalibrationTally;
}

/**
 * Turns detections in dump units into detections in result units: fills `time` and `segment` by the clock, maps
 * positions by the geometry, leaves out what lies outside the region of interest or inside a body (counted in
 * the tally, never silently), and puts the rows of each frame in canonical order. Frames left without rows stay.
 *
 * Works in place on the arrays of the blocks, which it owns from then on; where rows were left out the columns
 * of the block it gives are shorter views of the same buffers. Checks settings before the first block.
 *
 * Events: `geometry/outside-hull` (warning) at the end where control points were extrapolated;
 * `geometry/handedness` (note) at the start where y is turned in a volume and z is not.
 * Throws what `frameTimes`, `scaleMap`, `fitControlPoints`, `regionBounds`, `insideBodies` throw;
 * `geometry/control-points-planar` for control points with a dump that has z; `run/aborted`.
 * Cost: 40 to 75 ns a detection in the plane, about 30 of them for the order.
 */
export async function* calibrate(
  input: CalibrateInput,
  blocks: AsyncIterable<DetectionBlock>,
): AsyncGenerator<DetectionBlock> {
  const { settings, scan, context, tally } = input;
  const { map, hull } = mapOf(settings, scan);
  const bounds = regionBounds(settings.geometry.region, scan.dims);
  const inside = insideBodies(settings.body);
  const sort = createFrameSorter();
  const firstFrame = scan.frameNumbers[0] ?? 0;
  noteHandedness(settings, scan, context);
  let after: { frame: number; time: number } | null = null;
  for await (const block of blocks) {
    const { number } = block;
    const times = frameTimes({ clock: settings.clock, firstFrame, number, dumpTime: block.time, after });
    block.time.set(times.time);
    block.segment.set(times.segment);
    const last = number.length - 1;
    if (last >= 0) after = { frame: number[last]!, time: times.time[last]! };

    const rows = block.offsets[number.length]!;
    tally.detections += rows;
    const outside = hull === null ? null : outsideHull(hull, block, rows);
    map(block.x, block.y, block.z, rows);
    const kept = leaveOut(block, bounds, inside, outside, tally);
    const pause = context.breathe();
    if (pause !== undefined) await pause;
    for (let k = 0; k <= last; k++) {
      sort(kept, kept.offsets[k]!, kept.offsets[k + 1]!);
      const turn = context.breathe();
      if (turn !== undefined) await turn;
    }
    yield kept;
  }
  if (tally.outsideHull > 0) warnOutsideHull(context, tally);
}

/** The map from dump to result coordinates, and the hull of control points where there are any. */
function mapOf(
  settings: RunSettings,
  scan: DumpScan,
): { readonly map: CoordinateMap; readonly hull: Float64Array | null } {
  const { geometry } = settings;
  if (geometry.kind === 'scale') return { map: scaleMap(geometry, scan.dims), hull: null };
  if (scan.dims === 3) {
    throw new WakeloomError(
      'geometry/control-points-planar',
      'control points: got a dump with z, expected a planar one, which is all that control points in x and y can map; give a scale instead (run sheet: geometry)',
    );
  }
  return fitControlPoints(geometry);
}

/** Turning y alone mirrors a volume; whether that makes or breaks right-handed axes only the dump's author knows. */
function noteHandedness(settings: RunSettings, scan: DumpScan, context: RunContext): void {
  const { geometry } = settings;
  if (geometry.kind !== 'scale' || scan.dims !== 3 || geometry.yAxis !== 'down') return;
  if ((geometry.scaleZ ?? geometry.scale).value < 0) return;
  context.event({
    code: 'geometry/handedness',
    level: 'note',
    message:
      'y was turned to point up and z left as in the dump: the axes are right-handed only if z of the dump points towards the viewer; otherwise w and the sense of rotation come out mirrored.',
    details: {},
  });
}

/** 1 for rows whose dump position lies outside the hull. [rows] */
function outsideHull(hull: Float64Array, { x, y }: DetectionBlock, rows: number): Uint8Array {
  const outside = new Uint8Array(rows);
  for (let i = 0; i < rows; i++) outside[i] = inConvexHull(hull, x[i]!, y[i]!) ? 0 : 1;
  return outside;
}

/** Moves the rows to keep to the front of each column, frame by frame, and cuts the columns to length. */
function leaveOut(
  block: DetectionBlock,
  bounds: RegionBounds,
  inside: InsideTest | null,
  outside: Uint8Array | null,
  tally: CalibrationTally,
): DetectionBlock {
  const { x, y, z, brightness, row, given, offsets } = block;
  const { min, max } = bounds;
  const volume = block.dims === 3;
  const frames = block.number.length;
  const rows = offsets[frames]!;
  let to = 0;
  let from = 0;
  for (let k = 0; k < frames; k++) {
    const end = offsets[k + 1]!;
    for (; from < end; from++) {
      const px = x[from]!;
      const py = y[from]!;
      const within =
        px >= min[0] &&
        px <= max[0] &&
        py >= min[1] &&
        py <= max[1] &&
        (!volume || (z[from]! >= min[2] && z[from]! <= max[2]));
      if (!within) {
        tally.outsideRegion++;
        continue;
      }
      if (inside?.(px, py)) {
        tally.insideBody++;
        continue;
      }
      if (outside !== null) tally.outsideHull += outside[from]!;
      if (to !== from) {
        x[to] = px;
        y[to] = py;
        row[to] = row[from]!;
        if (volume) z[to] = z[from]!;
        if (brightness.length > 0) brightness[to] = brightness[from]!;
        if (given.length > 0) given[to] = given[from]!;
      }
      to++;
    }
    offsets[k + 1] = to;
  }
  if (to === rows && x.length === rows) return block;
  const frameIndex: FrameIndex = { number: block.number, time: block.time, segment: block.segment, offsets };
  return {
    ...frameIndex,
    dims: block.dims,
    x: x.subarray(0, to),
    y: y.subarray(0, to),
    z: volume ? z.subarray(0, to) : z,
    brightness: brightness.length > 0 ? brightness.subarray(0, to) : brightness,
    row: row.subarray(0, to),
    given: given.length > 0 ? given.subarray(0, to) : given,
  };
}

function warnOutsideHull(context: RunContext, tally: CalibrationTally): void {
  const kept = tally.detections - tally.outsideRegion - tally.insideBody;
  const percent = ((100 * tally.outsideHull) / kept).toFixed(2);
  context.event({
    code: 'geometry/outside-hull',
    level: 'warning',
    message: `${tally.outsideHull} of ${kept} detections (${percent} %) lie outside the hull of the control points, where the map is extrapolated; give control points up to the border, or a region of interest inside them.`,
    details: { outsideHull: tally.outsideHull, kept },
  });
}
