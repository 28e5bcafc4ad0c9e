import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';

/** Seeded uniform points in a unit square or cube, scaled and shifted. */
export function uniformPoints(count: number, dims: 2 | 3, seed: number, scale = 1, shift = 0) {
  const stream = randomStream(seed, 'points');
  const column = () => Float64Array.from({ length: count }, () => shift + scale * stream.uniform());
  return { x: column(), y: column(), z: dims === 3 ? column() : new Float64Array(0) };
}
