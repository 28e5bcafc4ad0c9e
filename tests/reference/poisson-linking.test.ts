import { CellIndex } from '@wakeloom/tracker/math/cell-index';
import { describe, expect, it } from 'vitest';
import reference from '../../data/reference/linking.json';
import { linkBlock, linkSet } from '../helpers/link-block';
import { uniformPoints } from '../helpers/points';

/**
 * A Poisson field moved as a whole by s: the nearest detection is another particle's with probability
 * 1 - exp(-pi n s^2) in the plane, 1 - exp(-4/3 pi n s^3) in space (Hertz 1909, Math. Ann. 67, 387; the rows of
 * data/reference/linking.json). Expected counts are binomial: bands of 4 standard deviations, fields of 40 000 (2-D).
 */
describe('plain nearest neighbour on a periodic box', () => {
  it.each(
    reference.nn_mismatch.rows.flatMap((row) => [
      [2, row.ratio_to_mean_nn, row.p2] as const,
      [3, row.ratio_to_mean_nn, row.p3] as const,
    ]),
  )('%d-D, displacement over mean nearest distance %d: errs with probability %d', (dims, ratio, expected) => {
    const count = dims === 2 ? 40_000 : 27_000;
    const inside = uniformPoints(count, dims, 21 + Math.round(ratio * 100));
    const mean = dims === 2 ? 0.5 / Math.sqrt(count) : 0.5539602784 / Math.cbrt(count);
    const move = ratio * mean;
    const border = 5 * mean;
    const box = periodic(inside, count, dims, border);
    const search = new CellIndex();
    search.build(box, 0, box.x.length, dims, [border, border, border]);
    const near = new Int32Array(box.x.length);
    let wrong = 0;
    for (let i = 0; i < count; i++) {
      // The particle now lies at its place + move; seen from the old place it is one of all moved points.
      const [px, py, pz] = [inside.x[i] - move, inside.y[i], dims === 3 ? inside.z[i] : 0];
      const found = search.near(wrap(px), py, pz, near);
      let best = -1;
      let least = Number.POSITIVE_INFINITY;
      for (let n = 0; n < found; n++) {
        const row = near[n];
        const square =
          (box.x[row] - wrap(px)) ** 2 + (box.y[row] - py) ** 2 + (dims === 3 ? (box.z[row] - pz) ** 2 : 0);
        if (square < least) [least, best] = [square, box.source[row]];
      }
      if (best !== i) wrong++;
    }
    const sd = Math.sqrt((expected * (1 - expected)) / count);
    expect(Math.abs(wrong / count - expected)).toBeLessThan(4 * sd);
  });
});

describe('with prediction', () => {
  // The flow of the first frames is known from votes before a link is made: no error at any displacement.
  it.each([0.25, 0.5, 1, 1.4])(
    'a field that moves by %d mean spacings a frame has no wrong or missed link',
    async (ratio) => {
      const count = 1500;
      const frames = 10;
      const field = uniformPoints(count, 2, 5);
      const move = ratio / Math.sqrt(count);
      const rows = count * frames;
      const frame = Int32Array.from({ length: rows }, (_, row) => Math.trunc(row / count));
      const block = {
        dims: 2 as const,
        number: Int32Array.from({ length: frames }, (_, k) => k),
        time: Float64Array.from({ length: frames }, (_, k) => k / 60),
        segment: new Int32Array(frames),
        offsets: Uint32Array.from({ length: frames + 1 }, (_, k) => k * count),
        x: Float64Array.from({ length: rows }, (_, row) => field.x[row % count] + 0.8 * move * frame[row]),
        y: Float64Array.from({ length: rows }, (_, row) => field.y[row % count] - 0.6 * move * frame[row]),
        z: new Float64Array(0),
        brightness: new Float32Array(0),
        row: Float64Array.from({ length: rows }, (_, row) => row),
        given: new Int32Array(0),
      };
      const { pathline } = await linkBlock(block);
      const links = linkSet(pathline, frame);
      let right = 0;
      for (let row = 0; row < rows - count; row++) if (links.has(`${row}>${row + count}`)) right++;
      expect(links.size - right).toBe(0);
      expect(rows - count - right).toBe(0);
    },
  );
});

function wrap(x: number): number {
  return x - Math.floor(x);
}

/** The points with copies beyond every side of the unit box. */
function periodic(points: ReturnType<typeof uniformPoints>, count: number, dims: 2 | 3, border: number) {
  const x: number[] = [];
  const y: number[] = [];
  const z: number[] = [];
  const source: number[] = [];
  const shifts = [-1, 0, 1];
  for (let i = 0; i < count; i++) {
    for (const a of shifts) {
      for (const b of shifts) {
        for (const c of dims === 3 ? shifts : [0]) {
          const place = [points.x[i] + a, points.y[i] + b, dims === 3 ? points.z[i] + c : 0.5];
          if (place.some((value) => value < -border || value > 1 + border)) continue;
          x.push(place[0]);
          y.push(place[1]);
          z.push(place[2]);
          source.push(i);
        }
      }
    }
  }
  return {
    x: Float64Array.from(x),
    y: Float64Array.from(y),
    z: dims === 3 ? Float64Array.from(z) : new Float64Array(0),
    source,
  };
}
