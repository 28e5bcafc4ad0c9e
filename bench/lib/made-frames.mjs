/**
 * Seeded frames for benches: particles in a periodic box with a mean stream and a cellular flow that has no divergence,
 * moved by midpoint steps, which is cheap. Three in a hundred are not seen in a frame; a false detection elsewhere
 * stands in for each, so that every frame holds the same number of rows. Not for judging links against truth.
 */
import { uniformFloat64 } from 'pure-rand/distribution/uniformFloat64';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';

const LOSSES = 0.03;
/** Standard deviation of the position noise, px. */
const NOISE = 0.1;
/** Mean spacing of particles, px. */
export const SPACING = 20;

/**
 * Yields { number, x, y, z, particle }, the arrays used again for the next frame; z is empty in the plane. `ratio`: mean
 * displacement a frame over the spacing. A particle that leaves the box comes in on the other side under a new number.
 */
export function* madeFrames({ frames, perFrame, ratio, seed, dims = 2 }) {
  const random = xoroshiro128plus(seed);
  const even = () => uniformFloat64(random);
  // Sum of four even numbers: near enough to normal for a bench, and cheap.
  const bell = () => (even() + even() + even() + even() - 2) * Math.sqrt(3);
  const edge = SPACING * perFrame ** (1 / dims);
  const axes = Array.from({ length: dims }, () => Float64Array.from({ length: perFrame }, () => edge * even()));
  const seen = [0, 1, 2].map((axis) => new Float64Array(axis < dims ? perFrame : 0));
  const identity = Int32Array.from({ length: perFrame }, (_, i) => i);
  const particle = new Int32Array(perFrame);
  let next = perFrame;
  // Factors so that the mean displacement comes out as the ratio says.
  const stream = 0.865 * ratio * SPACING;
  const swirl = 0.98 * ratio * SPACING;
  // Cells 25 and 22 spacings wide at 10 000 particles: gentle enough for a window of 7 frames.
  const wave = (2 * Math.PI * (dims === 2 ? 4 : 1)) / edge;
  const u = (x, y) => stream + swirl * Math.sin(wave * x) * Math.cos(wave * y);
  const v = (x, y) => -swirl * Math.cos(wave * x) * Math.sin(wave * y);
  for (let number = 0; number < frames; number++) {
    for (let i = 0; i < perFrame; i++) {
      const ghost = even() < LOSSES;
      particle[i] = ghost ? -1 : identity[i];
      for (let axis = 0; axis < dims; axis++) seen[axis][i] = ghost ? edge * even() : axes[axis][i] + NOISE * bell();
    }
    yield { number, x: seen[0], y: seen[1], z: seen[2], particle };
    for (let i = 0; i < perFrame; i++) {
      const x = axes[0][i];
      const y = axes[1][i];
      const mx = x + 0.5 * u(x, y);
      const my = y + 0.5 * v(x, y);
      axes[0][i] = x + u(mx, my);
      axes[1][i] = y + v(mx, my);
      if (dims === 3) axes[2][i] += 0.3 * stream;
      for (const column of axes) {
        if (column[i] >= 0 && column[i] < edge) continue;
        column[i] += column[i] < 0 ? edge : -edge;
        identity[i] = next++;
      }
    }
  }
}
