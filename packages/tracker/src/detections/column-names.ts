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

/** Edits (insert, delete, replace) that turn one word into the other. Cost: product of the lengths. */
function editDistance(a: string, b: string): number {
  let row = Array.from({ length: b.length + 1 }, (_, j) => j);
  for (let i = 1; i <= a.length; i++) {
    const next = [i];
    for (let j = 1; j <= b.length; j++) {
      next[j] = Math.min(row[j] + 1, next[j - 1] + 1, row[j - 1] + (a[i - 1] === b[j - 1] ? 0 : 1));
    }
    row = next;
  }
  return row[b.length];
}

/** The name nearest to `wanted`, or null when none is within half of its letters. */
export function nearestName(wanted: string, names: readonly string[]): string | null {
  let best: string | null = null;
  let distance = Number.POSITIVE_INFINITY;
  for (const name of names) {
    const d = editDistance(wanted.toLowerCase(), name.toLowerCase());
    if (d < distance) {
      distance = d;
      best = name;
    }
  }
  return best !== null && distance <= Math.max(1, Math.floor(wanted.length / 2)) ? best : null;
}
