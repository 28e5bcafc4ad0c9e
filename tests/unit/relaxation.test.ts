import { Relaxation } from '@wakeloom/tracker/linking/relaxation';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { describe, expect, it } from 'vitest';
import { type LoneFrame, loneFrame, type Place, uniformPicture } from '../helpers/lone-frame';

/** As in a run: risk above which links are left out, and how far from the flow a pair may lie, in spacings. */
const LIMIT = 0.3;
const REACH = 0.8;

function relax(
  dims: 2 | 3,
  frame: LoneFrame,
  reach = REACH,
  limit = LIMIT,
  picture: Place = [0, 0, 0],
  depthNoise = 1,
) {
  const relaxation = new Relaxation(dims, 1, reach, depthNoise);
  const { active, block, links, near, wide, before } = frame;
  return relaxation.link(limit, active, block, 0, 1, links, false, near, wide, before, uniformPicture(dims, picture));
}

/** Columns of the links by entry, -1: none. */
const tookOf = ({ links, active }: LoneFrame) => Array.from(links.took.subarray(0, active.count));

function scattered(dims: 2 | 3, count: number, seed: string): Place[] {
  const random = randomStream(91, seed);
  const edge = dims === 2 ? Math.sqrt(count) : Math.cbrt(count);
  const even = () => edge * random.uniform();
  return Array.from({ length: count }, () => [even(), even(), dims === 3 ? even() : 0]);
}

const moved = (places: readonly Place[], [a, b, c]: Place): Place[] => places.map(([x, y, z]) => [x + a, y + b, z + c]);

/** How many of the first have another of the second nearer to where the picture leads than their own. */
function misled(first: readonly Place[], second: readonly Place[]): number {
  const distance = (a: Place, b: Place) => Math.hypot(a[0] - b[0], a[1] - b[1], a[2] - b[2]);
  return first.filter((a, i) => second.some((b) => distance(a, b) < distance(a, second[i]))).length;
}

describe('a patch of lone detections that all move alike', () => {
  const DISPLACEMENTS: Place[] = [
    [0.7, 0, 0],
    [-0.4, 0.5, 0],
  ];

  it.each([2, 3] as const)('is linked although most are led to another by a picture at rest: %d-D', (dims) => {
    for (const displacement of DISPLACEMENTS) {
      const first = scattered(dims, 400, `patch ${displacement}`);
      const second = moved(first, displacement);
      const frame = loneFrame(dims, first, second, 3.4);
      expect(misled(first, second)).toBeGreaterThan(200);
      const made = relax(dims, frame);
      const took = tookOf(frame);
      // Not a wrong one; left are some at the rim, and some that by chance have a second pair with half the company.
      expect(took.filter((column, i) => column >= 0 && column !== i)).toEqual([]);
      expect(took.filter((column, i) => column === i).length).toBe(made);
      expect(made).toBeGreaterThan(0.9 * 400);
    }
  });

  it('is linked rightly among strays and losses', () => {
    const kept = scattered(2, 400, 'kept');
    const first = [...kept, ...scattered(2, 400, 'lost').slice(0, 60)];
    const second = [...moved(kept, [0.5, 0.3, 0]), ...scattered(2, 400, 'strays').slice(0, 60)];
    const frame = loneFrame(2, first, second, 3.4);
    const made = relax(2, frame);
    const right = tookOf(frame).filter((column, i) => i < 400 && column === i).length;
    expect(right).toBeGreaterThan(0.8 * 400);
    // Risks are stated: the sum of them tells about how many are wrong (Poisson, 4 standard deviations).
    let stated = 0;
    for (let column = 0; column < second.length; column++) stated += frame.links.risk[column];
    expect(made - right).toBeLessThanOrEqual(Math.ceil(stated + 4 * Math.sqrt(stated)));
  });

  it('is measured from what the picture says', () => {
    // Far beyond the reach from rest, near what the picture says.
    const first = scattered(2, 400, 'fast');
    const frame = loneFrame(2, first, moved(first, [5.5, -3.3, 0]), 3.4);
    expect(relax(2, frame, REACH, LIMIT, [5, -3, 0])).toBeGreaterThan(0.9 * 400);
    expect(tookOf(frame).filter((column, i) => column >= 0 && column !== i)).toEqual([]);
  });

  it('beyond the reach is left alone', () => {
    const first = scattered(2, 400, 'too fast');
    const frame = loneFrame(2, first, moved(first, [3, 0, 0]), 3.4);
    expect(relax(2, frame)).toBeLessThanOrEqual(0.02 * 400);
  });

  it('may be sheared and stretched', () => {
    const first = scattered(2, 400, 'sheared');
    const second = first.map(([x, y]): Place => [x + 0.4 + 0.04 * (y - 10), y + 0.03 * (x - 10), 0]);
    const frame = loneFrame(2, first, second, 3.4);
    // No more than 0.8 of a spacing anywhere: the fields are 20 wide.
    expect(relax(2, frame, 1.2)).toBeGreaterThan(0.75 * 400);
    expect(tookOf(frame).filter((column, i) => column >= 0 && column !== i).length).toBeLessThanOrEqual(0.01 * 400);
  });

  it('in space counts distances along the noisy axis that much less', () => {
    const first = scattered(3, 400, 'deep').map(([x, y, z]): Place => [x, y, 3 * z]);
    const frame = loneFrame(3, first, moved(first, [0.3, 0.2, 1.5]), 3.4, 3);
    expect(relax(3, frame, REACH, LIMIT, [0, 0, 0], 3)).toBeGreaterThan(0.9 * 400);
    expect(tookOf(frame).filter((column, i) => column >= 0 && column !== i)).toEqual([]);
  });
});

describe('random clutter', () => {
  it.each([2, 3] as const)('gives next to no link: %d-D', (dims) => {
    let made = 0;
    for (let seed = 0; seed < 4; seed++)
      made += relax(dims, loneFrame(dims, scattered(dims, 800, `a ${seed}`), scattered(dims, 800, `b ${seed}`), 3.4));
    expect(made).toBeLessThan(0.02 * 4 * 800);
  });
});

describe('support by neighbours', () => {
  /** All places of a lattice of `n` columns and `m` rows, a spacing apart, less those that are left out. */
  const lattice = (n: number, m: number, without: readonly number[] = []): Place[] =>
    Array.from({ length: n * m }, (_, k): Place => [k % n, Math.floor(k / n), 0]).filter(
      (_, k) => !without.includes(k),
    );
  const SHIFT: Place = [0.2, 0.1, 0];
  /** Each reaches its own only: half a spacing is farther than that. */
  const NARROW = 0.4;

  /** A neighbour at the squared distance d counts 1 - d / 2.5^2 if it moves alike. */
  const count = (...squares: number[]) => squares.reduce((sum, square) => sum + 1 - square / 6.25, 0);

  it('is the number of those that move alike, nearer ones more; risk is the chance over its square', () => {
    const places = lattice(3, 3);
    const frame = loneFrame(2, places, moved(places, SHIFT), 3.4);
    expect(relax(2, frame, NARROW)).toBe(9);
    const [corner, edge, midst] = [
      count(1, 1, 2, 4, 4, 5, 5),
      count(1, 1, 1, 2, 2, 4, 5, 5),
      count(1, 1, 1, 1, 2, 2, 2, 2),
    ];
    for (const [column, own] of [corner, edge, corner, edge, midst, edge, corner, edge, corner].entries()) {
      expect(frame.links.took[column]).toBe(column);
      expect(frame.links.takenBy[column]).toBe(column);
      // Support of a tenth is always possible by chance.
      expect(frame.links.risk[column]).toBeCloseTo(0.1 / own ** 2, 12);
      expect(frame.links.relaxed[column]).toBe(1);
    }
  });

  it('has to come from two at least', () => {
    // Three in a corner: 0.84 twice at best. Four in a square: 0.84 twice and 0.68.
    for (const [without, made] of [
      [[3], 0],
      [[], 4],
    ] as const) {
      const places = lattice(2, 2, without);
      expect(relax(2, loneFrame(2, places, moved(places, SHIFT), 3.4), NARROW)).toBe(made);
    }
  });

  it('comes from none that moves otherwise', () => {
    const places = lattice(2, 2);
    const second = moved(places, SHIFT);
    // By more than a tenth of a spacing and a tenth of the distance: the other three lose it too.
    second[3] = [second[3][0] + 0.1, second[3][1] - 0.35, 0];
    expect(relax(2, loneFrame(2, places, second, 3.4), 0.5)).toBe(0);
  });

  it('neighbours that are alike by half count by three quarters', () => {
    const places = lattice(3, 3);
    const second = moved(places, SHIFT);
    // The one in the midst is off by half of what is tolerated at the distance one, (0.1 + 0.1) / 2.
    second[4] = [second[4][0] + 0.1, second[4][1], 0];
    const frame = loneFrame(2, places, second, 3.4);
    expect(relax(2, frame, NARROW)).toBe(9);
    const diagonal = 1 - (0.1 / (0.1 + 0.1 * Math.SQRT2)) ** 2;
    const own = 4 * 0.84 * 0.75 + 4 * 0.68 * diagonal;
    expect(frame.links.risk[4]).toBeCloseTo(0.1 / own ** 2, 12);
  });

  it('a pair with a rival of equal support is not linked, and links of others stand', () => {
    const places = lattice(5, 5);
    // The one in the midst could go to either of two, as far off from what its neighbours do on either side.
    const second = moved(places, SHIFT);
    const [x, y] = second[12];
    second[12] = [x, y + 0.05, 0];
    second.push([x, y - 0.05, 0]);
    const frame = loneFrame(2, places, second, 3.4);
    expect(relax(2, frame, NARROW)).toBe(24);
    expect(tookOf(frame)).toEqual(places.map((_, i) => (i === 12 ? -1 : i)));
    expect([frame.links.takenBy[12], frame.links.takenBy[25]]).toEqual([-1, -1]);
    // With one of the two it is linked.
    const alone = loneFrame(2, places, second.slice(0, 25), 3.4);
    expect(relax(2, alone, NARROW)).toBe(25);
  });

  // Alike, or the one or the other a little more.
  it.each([
    [0.05, 0.05],
    [0.05, 0.04],
    [0.04, 0.05],
  ])('nor is either of two pathlines that want one detection and lie %f and %f off', (above, below) => {
    const places = lattice(5, 5);
    const [x, y] = places[12];
    const first = [...places];
    first[12] = [x, y + above, 0];
    first.push([x, y - below, 0]);
    const frame = loneFrame(2, first, moved(places, SHIFT), 3.4);
    expect(relax(2, frame, NARROW)).toBe(24);
    expect(tookOf(frame)).toEqual(first.map((_, i) => (i === 12 || i === 25 ? -1 : i)));
    expect(frame.links.takenBy[12]).toBe(-1);
  });

  it('a clear winner over a weak rival is linked, with more risk', () => {
    const places = lattice(5, 5);
    const second = moved(places, SHIFT);
    const plain = loneFrame(2, places, second, 3.4);
    relax(2, plain, NARROW);
    // Alike to no more than those at the rim of the neighbourhood, which tolerate 0.3.
    const [x, y] = second[12];
    const rival = loneFrame(2, places, [...second, [x, y + 0.25, 0]], 3.4);
    expect(relax(2, rival, 0.5)).toBe(25);
    expect(rival.links.took[12]).toBe(12);
    expect(rival.links.risk[12]).toBeGreaterThan(1.5 * plain.links.risk[12]);
  });
});

describe('limit of the risk', () => {
  it('is respected, and the same links are made below it', () => {
    const kept = scattered(2, 400, 'limit');
    const first = [...kept, ...scattered(2, 400, 'limit lost').slice(0, 100)];
    const second = [...moved(kept, [0.5, 0.3, 0]), ...scattered(2, 400, 'limit strays').slice(0, 100)];
    const free = loneFrame(2, first, second, 3.4);
    const all = relax(2, free, REACH, 1e9);
    let before = all;
    const risks = tookOf(free)
      .filter((column) => column >= 0)
      .map((column) => free.links.risk[column])
      .sort((a, b) => a - b);
    for (const limit of [risks[all - 2], risks[all >> 1], risks[all >> 3], risks[0], 0]) {
      const frame = loneFrame(2, first, second, 3.4);
      const made = relax(2, frame, REACH, limit);
      expect(made).toBeLessThan(before);
      before = made;
      const want = tookOf(free).map((column) => (column >= 0 && free.links.risk[column] <= limit ? column : -1));
      expect(tookOf(frame)).toEqual(want);
      expect(want.filter((column) => column >= 0).length).toBe(made);
    }
    expect(before).toBe(0);
    expect(all).toBeGreaterThan(300);
  });
});

describe('links that stand', () => {
  it('are not touched: neither taken detections nor linked pathlines take part', () => {
    const places = scattered(2, 300, 'standing');
    const frame = loneFrame(2, places, moved(places, [0.5, 0.3, 0]), 3.4);
    // Linked wrongly on purpose, to detections of others.
    for (let i = 0; i < 100; i++) frame.links.link(i, (i + 1) % 100, 0.007);
    const made = relax(2, frame);
    expect(made).toBeGreaterThan(100);
    for (let i = 0; i < 100; i++) {
      expect(frame.links.took[i]).toBe((i + 1) % 100);
      expect(frame.links.risk[i]).toBe(0.007);
      expect(frame.links.relaxed[i]).toBe(0);
    }
    expect(tookOf(frame).filter((column, i) => i >= 100 && column >= 0 && column !== i)).toEqual([]);
  });
});
