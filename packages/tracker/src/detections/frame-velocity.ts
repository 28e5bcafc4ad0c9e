import type { SampleBlock } from '../core/columns.js';
import { WakeloomError } from '../core/errors.js';

/**
 * Adds the velocity of a towed frame to every sample, in place: u_lab = u_camera + velocity. For a camera
 * carried along with a model through water at rest, measured velocities are those seen from the carriage.
 * Positions, times and accelerations stay as they are: the results keep the frame of the camera, in which the
 * model stands still, and a frame that moves evenly has no acceleration. To be called once, after the fit and
 * before anything that looks at velocities as flow (the grid); linking and fits work in the camera frame.
 *
 * @param block Samples; u, v (and w where dims is 3) change, NaN stays NaN.
 * @param velocity Length unit of the results per time unit of the results.
 * Throws `geometry/frame-velocity` where it is not finite. Accuracy: one Float32 rounding of u, v, w.
 */
export function addFrameVelocity(block: SampleBlock, velocity: readonly [number, number, number]): void {
  if (!velocity.every(Number.isFinite)) {
    throw new WakeloomError(
      'geometry/frame-velocity',
      `velocity of the frame: got (${velocity.join(', ')}), expected finite numbers (run sheet: geometry, frame velocity)`,
    );
  }
  const columns = block.dims === 3 ? [block.u, block.v, block.w] : [block.u, block.v];
  for (const [axis, column] of columns.entries()) {
    const add = velocity[axis]!;
    if (add === 0) continue;
    for (let i = 0; i < column.length; i++) column[i] = column[i]! + add;
  }
}
