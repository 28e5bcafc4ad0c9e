import type { Role } from './row-batch.js';

/**
 * Header names taken for a column when the settings say `auto`, best first. Compared in lower case, without a unit
 * in brackets or as a last part (`x [px]`, `x_mm` are `x`), with anything but letters and digits as `_`.
 * Common practice, no source.
 */
export const KNOWN_NAMES: Readonly<Record<Role, readonly string[]>> = {
  frame: [
    'frame',
    'frame_number',
    'frame_no',
    'frame_id',
    'frame_index',
    'frames',
    'image',
    'image_number',
    'image_no',
    'image_index',
    'img',
    'time_step',
    'timestep',
    'time_index',
    'snapshot',
    't',
  ],
  x: ['x', 'x_position', 'position_x', 'pos_x', 'x_pos', 'xpos', 'x_centre', 'x_center', 'centroid_x', 'xc'],
  y: ['y', 'y_position', 'position_y', 'pos_y', 'y_pos', 'ypos', 'y_centre', 'y_center', 'centroid_y', 'yc'],
  z: ['z', 'z_position', 'position_z', 'pos_z', 'z_pos', 'zpos', 'z_centre', 'z_center', 'centroid_z', 'zc'],
  brightness: ['brightness', 'intensity', 'amplitude', 'peak', 'grey', 'gray', 'i'],
  pathline: [
    'pathline',
    'pathline_id',
    'pathline_number',
    'track',
    'track_id',
    'track_number',
    'trajectory',
    'trajectory_id',
    'trajectory_number',
    'particle',
    'particle_id',
  ],
  time: ['time', 'seconds', 'timestamp', 'elapsed', 'elapsed_time', 't'],
};

/**
 * Units that may end a name: `x_mm`, `time [s]`, `intensity (a.u.)`. Times in other units than seconds are not among
 * them on purpose: a `time_ms` taken for seconds would be a silent factor of a thousand.
 */
const UNIT_ENDINGS = new Set([
  'px',
  'pix',
  'pixel',
  'pixels',
  'm',
  'cm',
  'mm',
  'um',
  'µm',
  'micron',
  'microns',
  's',
  'au',
]);

/** The plain form in which header names are compared with `KNOWN_NAMES`. */
export function plainName(name: string): string {
  const parts = name
    .toLowerCase()
    .replace('a.u.', 'au')
    .split(/[^\p{L}\p{N}]+/u)
    .filter((part) => part !== '');
  if (parts.length > 1 && UNIT_ENDINGS.has(parts[parts.length - 1])) parts.pop();
  return parts.join('_');
}
