import { NeighbourFlow } from '@wakeloom/tracker/linking/neighbour-flow';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { describe, expect, it } from 'vitest';
import { ridgeFit, ridgeOf, type SeenLink } from '../helpers/ridge-fit';

const RADIUS = 3.4;
/** Links are held as seen so often that the ridge is lost in rounding. */
const OFTEN = 1e12;
const ROUNDING = 1e-11;

function evenly(count: number, half: number, seed: string) {
  const random = randomStream(51, seed);
  return Array.from({ length: count }, () => [0, 1].map(() => half * (2 * random.uniform() - 1)) as [number, number]);
}

/** Links of a uniform shear with noise, number n tagged n. */
function noisy(count: number, seed: string): SeenLink[] {
  const random = randomStream(52, seed);
  return evenly(count, 3, seed).map(([x, y]) => ({
    at: [x, y, 0],
    velocity: [1 + 0.2 * y + 0.1 * random.normal(), 0.1 * random.normal(), 0],
    trust: 0.5 + 0.5 * random.uniform(),
  }));
}

function flowOf(links: readonly SeenLink[], tagOf = (n: number) => n): NeighbourFlow {
  const flow = new NeighbourFlow(2, RADIUS, 1);
  flow.begin(links.length);
  for (const [n, { at, velocity, trust }] of links.entries()) flow.add(tagOf(n), ...at, ...velocity, trust);
  return flow;
}

/** Velocity at a place from the fit about it. */
function at(flow: NeighbourFlow, x: number, y: number, without = -1): [number, number] | null {
  const into = new Float64Array(3);
  return flow.along(x, y, 0, 0, x, y, 0, without, into) > 0 ? [into[0], into[1]] : null;
}

/** A fit of the same links by itself, whose last digits may differ: other order of sums. */
function expectSame(got: [number, number] | null, want: [number, number] | null): void {
  expect(got).not.toBeNull();
  expect(want).not.toBeNull();
  for (let c = 0; c < 2; c++) expect(Math.abs(got![c] - want![c])).toBeLessThan(ROUNDING);
}

describe('a step along the flow of neighbours', () => {
  // A turn by `angle` about the origin takes p to q. With t = tan(angle / 2) and J the quarter turn,
  // q - p = t J (q + p): chords over one unit of time are a solid rotation of rate 2 t read at their middles.
  const rotation = (angle: number) => {
    const rate = 2 * Math.tan(0.5 * angle);
    const links = evenly(60, 3, `turn ${angle}`).map(([x, y]): SeenLink => {
      const qx = Math.cos(angle) * x - Math.sin(angle) * y;
      const qy = Math.sin(angle) * x + Math.cos(angle) * y;
      return { at: [0.5 * (x + qx), 0.5 * (y + qy), 0], velocity: [qx - x, qy - y, 0], trust: OFTEN };
    });
    return { flow: flowOf(links), rate, half: Math.tan(0.5 * angle) };
  };

  it.each([-0.9, 0.05, 0.4, 1.2])(
    'of a rotation by %f goes to the end of the arc when fitted at its middle',
    (angle) => {
      const { flow } = rotation(angle);
      for (const [x, y] of evenly(10, 1, 'starts')) {
        const qx = Math.cos(angle) * x - Math.sin(angle) * y;
        const qy = Math.sin(angle) * x + Math.cos(angle) * y;
        const into = new Float64Array(3);
        flow.along(x, y, 0, 1, 0.5 * (x + qx), 0.5 * (y + qy), 0, -1, into);
        expect(Math.hypot(x + into[0] - qx, y + into[1] - qy)).toBeLessThan(ROUNDING);
      }
    },
  );

  it.each([-0.9, 0.05, 0.4, 1.2])('of a rotation by %f is off by tan(angle / 2) cubed of a wrong middle', (angle) => {
    const { flow, rate, half } = rotation(angle);
    for (const [n, [x, y]] of evenly(10, 1, 'starts').entries()) {
      const chord = [(Math.cos(angle) - 1) * x - Math.sin(angle) * y, Math.sin(angle) * x + (Math.cos(angle) - 1) * y];
      // The start itself taken for the middle, and places about it.
      const [mx, my] = n === 0 ? [x, y] : [x + 0.1 * n, y - 0.15 * n];
      // Velocity at the supposed middle less the right one; every turn makes it J t times what it was.
      const [ex, ey] = [-rate * my - chord[0], rate * mx - chord[1]];
      const into = new Float64Array(3);
      flow.along(x, y, 0, 1, mx, my, 0, -1, into);
      expect(Math.abs(into[0] - chord[0] - half ** 3 * ey)).toBeLessThan(ROUNDING);
      expect(Math.abs(into[1] - chord[1] + half ** 3 * ex)).toBeLessThan(ROUNDING);
    }
  });

  it('counts time: twice as long at half the speed leads to the same end', () => {
    const { flow } = rotation(0.6);
    const slow = new NeighbourFlow(2, RADIUS, 1);
    slow.begin(flow.count);
    for (let n = 0; n < flow.count; n++) slow.add(n, flow.x[n], flow.y[n], 0, flow.u[n] / 2, flow.v[n] / 2, 0, OFTEN);
    const [fast, half] = [new Float64Array(3), new Float64Array(3)];
    flow.along(0.5, 0.2, 0, 1, 0.4, 0.3, 0, -1, fast);
    slow.along(0.5, 0.2, 0, 2, 0.4, 0.3, 0, -1, half);
    expect([2 * half[0], 2 * half[1]]).toEqual([fast[0], fast[1]]);
  });
});

describe('which neighbours count', () => {
  it('none: nothing is said where no link is near, and nothing is written', () => {
    const into = Float64Array.of(5, 6, 7);
    const flow = new NeighbourFlow(2, RADIUS, 1);
    flow.begin(4);
    expect(flow.along(0, 0, 0, 1, 0, 0, 0, -1, into)).toBe(0);
    flow.add(3, 0, 0, 0, 1, 1, 0, 1);
    expect(flow.along(0, 0, 0, 1, 0, 3.5, 0, -1, into)).toBe(0);
    // On the very rim its weight is none.
    expect(flow.along(0, 0, 0, 1, 3.4, 0, 0, -1, into)).toBe(0);
    // The only one there is left out.
    expect(flow.along(0, 0, 0, 1, 0.1, 0, 0, 3, into)).toBe(0);
    expect([...into]).toEqual([5, 6, 7]);
    expect(flow.along(0, 0, 0, 1, 0.1, 0, 0, 2, into)).toBeGreaterThan(0);
    expect([...into]).toEqual([1, 1, 0]);
  });

  it('forgets them for the next frame', () => {
    const flow = flowOf(noisy(30, 'old'));
    at(flow, 0, 0);
    const links = noisy(40, 'new');
    flow.begin(links.length);
    expect(at(flow, 0, 0)).toBeNull();
    for (const [n, one] of links.entries()) flow.add(n, ...one.at, ...one.velocity, one.trust);
    flow.begin(links.length);
    for (const [n, one] of links.entries()) flow.add(n, ...one.at, ...one.velocity, one.trust);
    expect(at(flow, 0, 0)).toEqual(at(flowOf(links), 0, 0));
  });

  it('all but those of the tag that is left out, also after tags were given anew', () => {
    const links = noisy(40, 'tags');
    const flow = flowOf(links, (n) => n % 20);
    for (const tag of [0, 7, 19]) {
      const others = flowOf(links.filter((_, n) => n % 20 !== tag));
      expectSame(at(flow, 0.3, 0.2, tag), at(others, 0.3, 0.2));
    }
    const all = at(flow, 0.3, 0.2);
    expect(at(flow, 0.3, 0.2, 20)).toEqual(all);
    const without7 = at(flow, 0.3, 0.2, 7);
    flow.retag(Int32Array.from({ length: 20 }, (_, tag) => 100 - tag));
    expect(at(flow, 0.3, 0.2, 93)).toEqual(without7);
    expect(at(flow, 0.3, 0.2, 7)).toEqual(all);
    expect(without7).not.toEqual(all);
  });

  it('each by its trust: three links at one place are one of three times the trust, none of no trust', () => {
    const links = noisy(20, 'trust');
    const heavy = links.map((one, n) => ({ ...one, trust: n === 4 ? 3 * one.trust : n === 5 ? 0 : one.trust }));
    const many = [...links.filter((_, n) => n !== 5), links[4], links[4]];
    expectSame(at(flowOf(heavy), 0, 0), at(flowOf(many), 0, 0));
    expect(at(flowOf(heavy), 0, 0)).not.toEqual(at(flowOf(links), 0, 0));
  });

  it('a surer link draws the flow nearer to itself', () => {
    const links = noisy(20, 'draw');
    const odd: SeenLink = { at: [0.2, 0.1, 0], velocity: [9, -9, 0], trust: 0.05 };
    const off = [0.05, 0.2, 0.5, 1].map((trust) => {
      const [u, v] = at(flowOf([...links, { ...odd, trust }]), 0.2, 0.1)!;
      return Math.hypot(u - 9, v + 9);
    });
    expect(off).toEqual([...off].sort((a, b) => b - a));
    expect(off[3]).toBeLessThan(off[0] - 0.5);
  });

  it('in space by an ellipsoid longer along the noisy axis', () => {
    const into = new Float64Array(3);
    const flow = new NeighbourFlow(3, 2, 3);
    flow.begin(1);
    flow.add(0, 0, 0, 0, 1, 2, 3, 0.7);
    expect(flow.along(0, 0, 0, 1, 0, 0, 6.1, -1, into)).toBe(0);
    expect(flow.along(0, 0, 0, 1, 2.1, 0, 0, -1, into)).toBe(0);
    // At 4.5 of 6 along z, (3/4)^2 = 9/16: (7/16)^2 of the trust.
    expect(flow.along(0, 0, 0, 1, 0, 0, 4.5, -1, into)).toBeCloseTo(0.7 * (7 / 16) ** 2, 14);
    for (const [c, want] of [1, 2, 3].entries()) expect(Math.abs(into[c] - want)).toBeLessThan(ROUNDING);
  });
});

describe('how good a fit is', () => {
  it('leverage grows as the fit reaches out of its neighbours', () => {
    const lattice: SeenLink[] = [];
    for (let i = -6; i <= 0; i++) {
      for (let j = -6; j <= 6; j++) lattice.push({ at: [i, j, 0], velocity: [1, 0, 0], trust: 1 });
    }
    const flow = flowOf(lattice);
    // From within to three spacings beyond the last row: by the definition from a solver of its own, and ever more.
    const reaches = [-3, -2, -1, -0.5, 0, 0.5, 1, 1.5, 2, 2.5, 3];
    const leverage = reaches.map((x) => {
      at(flow, x, 0.3);
      const want = ridgeFit(2, lattice, [x, 0.3, 0], RADIUS, 1, ridgeOf(2, 0.001, 0.003))!;
      expect(flow.leverage / want.leverage).toBeCloseTo(1, 7);
      return flow.leverage;
    });
    for (let n = 4; n < reaches.length; n++) expect(leverage[n]).toBeGreaterThan(leverage[n - 1]);
    for (const within of leverage.slice(0, 4)) expect(within).toBeLessThan(leverage[4]);
    // A spacing beyond the last row it is worse than one link, in the midst of many far better.
    expect(leverage[6]).toBeGreaterThan(1);
    expect(leverage[0]).toBeLessThan(0.5);
  });

  it('a lone neighbour has the leverage 1 over its weight at the place itself', () => {
    const flow = flowOf([{ at: [0, 0, 0], velocity: [1, 2, 0], trust: 0.8 }]);
    at(flow, 0, 0);
    expect(flow.weight).toBe(0.8);
    expect(flow.leverage).toBeCloseTo(1 / 0.8, 14);
    expect(flow.residual).toBeLessThan(1e-15);
  });

  it('two at one place that disagree leave half their squared difference', () => {
    const flow = flowOf([
      { at: [1, 1, 0], velocity: [2, 0, 0], trust: 1 },
      { at: [1, 1, 0], velocity: [3, 4, 0], trust: 1 },
    ]);
    expectSame(at(flow, 1, 1), [2.5, 2]);
    expect(flow.residual).toBeCloseTo(0.5 * (1 + 16), 12);
  });
});

describe('handing on', () => {
  const links = noisy(50, 'hand');

  it('follows another, also a longer one, and lets go of it with the next frame', () => {
    const flow = flowOf(links);
    const wide = new NeighbourFlow(2, RADIUS, 1);
    wide.follow(flow);
    expect(wide.count).toBe(50);
    expect(at(wide, 0.3, 0.2, 5)).toEqual(at(flow, 0.3, 0.2, 5));
    const more = flowOf(noisy(200, 'more'));
    wide.follow(more);
    expect(at(wide, -1, 0.2)).toEqual(at(more, -1, 0.2));
    expect(at(flow, -1, 0.2)).not.toEqual(at(more, -1, 0.2));
    wide.begin(1);
    expect(at(wide, -1, 0.2)).toBeNull();
    wide.follow(new NeighbourFlow(2, RADIUS, 1));
    expect(at(wide, -1, 0.2)).toBeNull();
  });

  it('a wider one that follows sees farther', () => {
    const far = flowOf([{ at: [0, 0, 0], velocity: [1, 2, 0], trust: 1 }]);
    const wide = new NeighbourFlow(2, 2 * RADIUS, 1);
    wide.follow(far);
    expect(at(far, 5, 0)).toBeNull();
    expectSame(at(wide, 5, 0), [1, 2]);
  });

  it('turned round in time it runs backward, of no pathline, and comes back by turning again', () => {
    const flow = flowOf(links);
    const before = at(flow, 0.3, 0.2)!;
    flow.turnRound();
    // The number -1 stands for no pathline; any other finds nothing to leave out.
    for (const tag of [0, 5, 49]) expect(at(flow, 0.3, 0.2, tag)).toEqual([-before[0], -before[1]]);
    flow.turnRound();
    expect(at(flow, 0.3, 0.2, 5)).toEqual(before);
  });

  it('goes on from its data as if it were the same, and the data are copies', () => {
    const flow = flowOf(links);
    const data = flow.toData();
    expect(data.map((column) => column.length)).toEqual(new Array(7).fill(50));
    const want = at(flow, 0.3, 0.2, 1000);
    flow.turnRound();
    const other = flowOf(noisy(10, 'overwritten'));
    other.restore(data);
    expect(other.count).toBe(50);
    for (const tag of [0, 5, 49]) expect(at(other, 0.3, 0.2, tag)).toEqual(want);
    other.turnRound();
    const third = new NeighbourFlow(2, RADIUS, 1);
    third.restore(data);
    expect(at(third, 0.3, 0.2, 1000)).toEqual(want);
    third.restore(new NeighbourFlow(2, RADIUS, 1).toData());
    expect(at(third, 0.3, 0.2)).toBeNull();
  });
});
