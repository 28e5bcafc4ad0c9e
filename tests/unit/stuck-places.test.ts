import { StuckLinks, withoutPlaces } from '@wakeloom/tracker/linking/stuck-links';
import { findStuckPlaces, withinFlow } from '@wakeloom/tracker/linking/stuck-places';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { describe, expect, it } from 'vitest';
import { type LinkedPoint, linkedBlock, sliceFrames } from '../helpers/linked.js';

const NOISE = 0.1;
const SPACING = 22;

/** Things at places that move by `step` a frame, seen in `share` of the frames. */
function things(seed: string, frames: number, step: number, share: number, dims: 2 | 3 = 2) {
  const random = randomStream(121, seed);
  const points: LinkedPoint[] = [];
  for (let frame = 0; frame < frames; frame++) {
    for (let i = 0; i < 200; i++) {
      const [x, y, z] = [30 * (i % 20) + step * frame, 30 * Math.floor(i / 20), (7 * i) % 50];
      if (random.uniform() >= share) continue;
      const noise = () => NOISE * random.normal();
      points.push({ frame, pathline: i, x: x + noise(), y: y + noise(), z: z + 3 * noise() });
    }
  }
  return linkedBlock(points, { dims });
}

describe('places that hold a detection in most frames', () => {
  it.each([2, 3] as const)(
    'finds specks to their noise in %i-D, once each, however the frames are cut',
    async (dims) => {
      const block = things(`specks ${dims}`, 80, 0, 0.8, dims);
      const whole = await findStuckPlaces([block], dims, SPACING, 3);
      expect(whole.length).toBeGreaterThanOrEqual(198);
      expect(whole.length).toBeLessThanOrEqual(200);
      for (const { at, radius, seen } of whole) {
        const i = Math.round(at[0] / 30) + 20 * Math.round(at[1] / 30);
        // Median of 64: 1.25 sigma / 8, five of them.
        expect(Math.abs(at[0] - 30 * (i % 20))).toBeLessThan((5 * 1.25 * NOISE) / 8);
        if (dims === 3) expect(Math.abs(at[2] - ((7 * i) % 50))).toBeLessThan((5 * 1.25 * 3 * NOISE) / 8);
        expect(radius[0] / (4 * NOISE)).toBeGreaterThan(0.6);
        expect(radius[0] / (4 * NOISE)).toBeLessThan(1.6);
        expect(seen).toBeGreaterThan(70);
      }
      const pieces = [sliceFrames(block, 0, 13), sliceFrames(block, 13, 80)];
      expect(await findStuckPlaces(pieces, dims, SPACING, 3)).toEqual(whole);
    },
  );

  it.each([0.03, 0.1, 1, 5])('names none of things that move %f px a frame, with noise of 0.1 px', async (step) => {
    expect(await findStuckPlaces([things('slow', 80, step, 1)], 2, SPACING, 1)).toEqual([]);
  });

  it('names none that are seen in less than half of the frames, and none where there are too few frames', async () => {
    expect(await findStuckPlaces([things('blinking', 100, 0, 0.4)], 2, SPACING, 1)).toEqual([]);
    expect(await findStuckPlaces([things('short', 29, 0, 1)], 2, SPACING, 1)).toEqual([]);
  });

  it('where the flow hardly moves, a speck and a tracer are the same', async () => {
    const places = await findStuckPlaces([things('still', 60, 0, 1)], 2, SPACING, 1);
    expect(places.length).toBe(200);
    expect(withinFlow(places, () => 0.001)).toEqual([]);
    expect(withinFlow(places, (x) => (x > 285 ? 1 : 0)).length).toBe(100);
  });
});

describe('links at stuck places', () => {
  const place = { at: [10, 10, 0], radius: [0.5, 0.5, 0], seen: 100 } as const;
  const at = (frame: number, x: number): LinkedPoint => ({ frame, pathline: -1, x, y: 10 });

  it('takes the nearest detection of a frame, breaks where more frames are missing than the bridge', () => {
    const block = linkedBlock([at(0, 10.1), at(0, 10.3), at(1, 9.8), at(4, 10), at(8, 10.2), at(9, 11)]);
    const links = new StuckLinks([place], 2, 2);
    const placeOf = links.take(block);
    expect(Array.from(placeOf)).toEqual([0, -1, 0, 0, 0, -1]);
    const pathline = new Int32Array(6).fill(-1);
    // Pathlines that the linker has begun before each frame: 0, 1, 1, 5, 7.
    for (const [k, begun] of [0, 1, 1, 5, 7].entries()) links.frame(block, k, placeOf, begun, pathline);
    expect(Array.from(pathline)).toEqual([0, -1, 0, 0, 6, -1]);
    expect([...links.pathlines]).toEqual([0, 6]);
    expect(links.tally).toEqual({ links: 2, bridging: 1, leftOutForRisk: 0, pathlines: 2 });
    // The linker's own 0 .. 8 take the numbers between, in order.
    expect([0, 1, 4, 5, 6, 8].map((id) => links.shifted(id))).toEqual([1, 2, 5, 7, 8, 10]);
  });

  it('leaves the other rows in their order', () => {
    const block = linkedBlock([at(0, 10), at(0, 20), at(1, 30), at(1, 10), at(1, 40)]);
    const { block: rest, rows } = withoutPlaces(block, Int32Array.of(0, -1, -1, 0, -1));
    expect(Array.from(rows)).toEqual([1, 2, 4]);
    expect(Array.from(rest.offsets)).toEqual([0, 1, 3]);
    expect(Array.from(rest.x)).toEqual([20, 30, 40]);
    expect(Array.from(rest.row)).toEqual([1, 2, 4]);
  });
});
