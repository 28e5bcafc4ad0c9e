import { LonePairs } from '@wakeloom/tracker/linking/lone-pairs';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { describe, expect, it } from 'vitest';
import { type LoneFrame, loneFrame, type Place, uniformPicture } from '../helpers/lone-frame';

const REACH = 0.8;

function collect(dims: 2 | 3, frame: LoneFrame, picture: Place, anew = false, depthNoise = 1, pairs?: LonePairs) {
  const lone = pairs ?? new LonePairs(dims, REACH, depthNoise);
  const { active, block, links, near, wide, before } = frame;
  lone.collect(active, block, 0, 1, links, anew, near, wide, before, uniformPicture(dims, picture));
  // Pairs as entry, column and offset.
  const found: { pair: string; offset: number[] }[] = [];
  for (let b = 0; b < lone.lone; b++) {
    for (let p = lone.start[b]; p < lone.start[b + 1]; p++) {
      const offset = [lone.offX[p], lone.offY[p], lone.offZ[p]];
      found.push({ pair: `${lone.entry[b]}>${lone.column[lone.other[p]]}`, offset });
    }
  }
  return found.sort((a, b) => (a.pair < b.pair ? -1 : 1));
}

const names = (found: { pair: string }[]) => found.map(({ pair }) => pair);

function scattered(dims: 2 | 3, count: number, half: number, seed: string): Place[] {
  const random = randomStream(81, seed);
  const even = () => half * (2 * random.uniform() - 1);
  return Array.from({ length: count }, () => [even(), even(), dims === 3 ? even() : 0]);
}

describe('pairs of lone detections', () => {
  it.each([
    [2, 1],
    [3, 1],
    [3, 2.5],
  ] as const)('are all within the reach of where the picture leads: %d-D, depth noise %f', (dims, depthNoise) => {
    const velocity: Place = [0.5, -0.3, dims === 3 ? 0.4 : 0];
    const first = scattered(dims, 300, dims === 2 ? 9 : 4, 'first');
    const second = scattered(dims, 250, dims === 2 ? 9 : 4, 'second');
    // A block of pairs is used again for the frame: what it held before must not matter.
    const lone = new LonePairs(dims, REACH, depthNoise);
    collect(dims, loneFrame(dims, second, first, 3, depthNoise), velocity, false, depthNoise, lone);
    const found = collect(dims, loneFrame(dims, first, second, 3, depthNoise), velocity, false, depthNoise, lone);
    const want: { pair: string; offset: number[] }[] = [];
    for (const [i, a] of first.entries()) {
      for (const [c, b] of second.entries()) {
        const offset = [0, 1, 2].map((axis) => (b[axis] - a[axis] - velocity[axis]) / (axis === 2 ? depthNoise : 1));
        if (Math.hypot(...offset) <= REACH) want.push({ pair: `${i}>${c}`, offset });
      }
    }
    want.sort((a, b) => (a.pair < b.pair ? -1 : 1));
    expect(want.length).toBeGreaterThan(200);
    expect(names(found)).toEqual(names(want));
    for (const [n, { offset }] of found.entries())
      for (const axis of [0, 1, 2]) expect(Math.abs(offset[axis] - want[n].offset[axis])).toBeLessThan(1e-13);
  });

  it('leave out what is linked and pathlines that missed a frame; age does not matter', () => {
    const places: Place[] = [0, 1, 2, 3, 4, 5].map((n) => [10 * n, 0, 0]);
    const frame = loneFrame(2, places, places, 3);
    frame.links.link(1, 1, 0.01);
    // The detection before entry 2 is taken by a pathline that is elsewhere.
    frame.active.age[3] = 2;
    frame.active.missed[4] = 1;
    frame.links.link(3, 2, 0.01);
    frame.active.age[5] = 7;
    expect(names(collect(2, frame, [0, 0, 0]))).toEqual(['0>0', '5>5']);
  });

  it('are none without lone ones or free ones', () => {
    expect(collect(2, loneFrame(2, [], [[0, 0, 0]], 3), [0, 0, 0])).toEqual([]);
    expect(collect(2, loneFrame(2, [[0, 0, 0]], [], 3), [0, 0, 0])).toEqual([]);
    const taken = loneFrame(2, [[0, 0, 0]], [[0, 0, 0]], 3);
    taken.links.link(0, 0, 0);
    expect(collect(2, taken, [0, 0, 0])).toEqual([]);
  });

  describe('go by', () => {
    // One lone detection at the origin, free ones where each source of the flow would lead to.
    const ends: Place[] = [
      [2, 0, 0],
      [0, 2, 0],
      [-2, 0, 0],
      [0, -2, 0],
    ];
    const [PREDICTED, NEAR, WIDE, PICTURE] = [['0>0'], ['0>1'], ['0>2'], ['0>3']];
    const picture: Place = [0, -2, 0];
    const frame = () => loneFrame(2, [[0, 0, 0]], ends, 3);
    const addLinks = (flow: LoneFrame['near'], distance: number, [u, v]: Place, tag = 7) => {
      flow.begin(8);
      for (let n = 0; n < 8; n++) {
        const [x, y] = [distance * Math.cos(0.8 * n), distance * Math.sin(0.8 * n)];
        // About the middle of the step, which each flow makes itself.
        flow.add(tag, x + 0.5 * u, y + 0.5 * v, 0, u, v, 0, 1);
      }
    };

    it('the picture where nothing else is known', () => {
      expect(names(collect(2, frame(), picture))).toEqual(PICTURE);
      expect(names(collect(2, frame(), picture, true))).toEqual(PICTURE);
    });

    it('the links of this interval rather than the picture, near ones rather than far ones', () => {
      const wide = frame();
      addLinks(wide.wide, 1, [-2, 0, 0]);
      expect(names(collect(2, wide, picture))).toEqual(WIDE);
      addLinks(wide.near, 1, [0, 2, 0]);
      expect(names(collect(2, wide, picture))).toEqual(NEAR);
    });

    it('the links of the interval before where this one has none nearby', () => {
      const earlier = frame();
      addLinks(earlier.before, 1, [0, 2, 0]);
      expect(names(collect(2, earlier, picture))).toEqual(['0>1']);
      addLinks(earlier.wide, 1, [-2, 0, 0]);
      expect(names(collect(2, earlier, picture))).toEqual(WIDE);
    });

    it('no neighbours that are too few, or its own link', () => {
      const few = frame();
      few.near.begin(1);
      few.near.add(7, 0, 0, 0, 0, 2, 0, 1);
      expect(names(collect(2, few, picture))).toEqual(PICTURE);
      const own = frame();
      addLinks(own.near, 1, [0, 2, 0], 0);
      expect(names(collect(2, own, picture))).toEqual(PICTURE);
    });

    it('a prediction by the flow that was made in this frame, unless it is to be made anew', () => {
      const predicted = frame();
      addLinks(predicted.near, 1, [0, 2, 0]);
      predicted.active.noteFlow(0, Float64Array.of(2, 0, 0));
      [predicted.active.px[0], predicted.active.py[0], predicted.active.pz[0]] = [2, 0, 0];
      expect(names(collect(2, predicted, picture))).toEqual(PREDICTED);
      expect(names(collect(2, predicted, picture, true))).toEqual(NEAR);
    });
  });
});
