import { NeighbourFlow } from '@wakeloom/tracker/linking/neighbour-flow';
import { sumAbout, TERMS } from '@wakeloom/tracker/linking/neighbour-sums';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { describe, expect, it } from 'vitest';
import { quadraticTerms, ridgeFit, ridgeOf, type SeenLink } from '../helpers/ridge-fit';

const EPSILON = 2 ** -52;
/** The ridge that the fit states: of linear and of quadratic terms, offsets in units of the radius. */
const LINEAR = 0.001;
const QUADRATIC = 0.003;
const RADIUS = 3.4;
const DEPTH_NOISE = 2.5;

type Place = [number, number, number];

/** Links spread evenly about the origin, a little farther than a fit about a place near it reaches. */
function scattered(dims: 2 | 3, count: number, seed: string, velocity: (at: Place) => Place): SeenLink[] {
  const random = randomStream(41, seed);
  const even = (half: number) => half * (2 * random.uniform() - 1);
  return Array.from({ length: count }, () => {
    const at: Place = [even(4.5), even(4.5), dims === 3 ? even(4.5 * DEPTH_NOISE) : 0];
    return { at, velocity: velocity(at), trust: 0.2 + 0.8 * random.uniform() };
  });
}

function flowOf(dims: 2 | 3, links: readonly SeenLink[], times = 1): NeighbourFlow {
  const flow = new NeighbourFlow(dims, RADIUS, dims === 3 ? DEPTH_NOISE : 1);
  flow.begin(links.length);
  for (const [n, { at, velocity, trust }] of links.entries()) flow.add(n, ...at, ...velocity, times * trust);
  return flow;
}

/** Value of the fit about a place, and its gradients by reading beside it: with no step the flow is read where it is asked for. */
function read(flow: NeighbourFlow, dims: 2 | 3, about: Place, without = -1): { value: number[]; slope: number[][] } {
  const into = new Float64Array(3);
  flow.along(...about, 0, ...about, without, into);
  const value = [...into.subarray(0, dims)];
  const slope = value.map(() => new Array<number>(dims).fill(0));
  for (let axis = 0; axis < dims; axis++) {
    const beside: Place = [...about];
    beside[axis] += RADIUS;
    flow.along(...beside, 0, ...about, without, into);
    for (let c = 0; c < dims; c++) slope[c][axis] = (into[c] - value[c]) / RADIUS;
  }
  return { value, slope };
}

/** A quadratic with coefficients of order one in offsets of a radius from `about`, and those coefficients. */
function quadratic(dims: 2 | 3, about: Place, seed: string) {
  const random = randomStream(42, seed);
  const size = [RADIUS, RADIUS, RADIUS * DEPTH_NOISE];
  const coefficients = Array.from({ length: dims }, () => quadraticTerms(dims, 1, 1, 1).map(() => random.normal()));
  const velocity = (at: Place): Place => {
    const d = at.map((x, axis) => (x - about[axis]) / size[axis]);
    const terms = quadraticTerms(dims, d[0], d[1], d[2]);
    const [u, v, w] = coefficients.map((one) => one.reduce((sum, c, m) => sum + c * terms[m], 0));
    return [u, v, w ?? 0];
  };
  return { coefficients, velocity };
}

const CASES = [
  // Full neighbourhoods, thin ones, and fewer links than the quadratic has terms: the ridge alone decides there.
  [2, 90],
  [2, 12],
  [2, 4],
  [3, 260],
  [3, 40],
  [3, 7],
] as const;

describe('the fit of the links about a place', () => {
  it.each(CASES)('is that of a general least-squares solver: %d-D, %d links', (dims, count) => {
    const random = randomStream(43, `noise ${dims} ${count}`);
    const depth = dims === 3 ? DEPTH_NOISE : 1;
    const ridge = ridgeOf(dims, LINEAR, QUADRATIC);
    let fits = 0;
    for (let trial = 0; trial < 12; trial++) {
      const links = scattered(dims, count, `${count} ${trial}`, () => [
        3 + random.normal(),
        random.normal(),
        dims === 3 ? random.normal() : 0,
      ]);
      const flow = flowOf(dims, links);
      const about: Place = [random.normal(), random.normal(), dims === 3 ? 2 * random.normal() : 0];
      const out = trial % 2 === 0 ? -1 : trial;
      const { value, slope } = read(flow, dims, about, out);
      const want = ridgeFit(
        dims,
        links.filter((_, n) => n !== out),
        about,
        RADIUS,
        depth,
        ridge,
      );
      if (want === null) {
        expect(flow.along(...about, 0, ...about, out, new Float64Array(3))).toBe(0);
        continue;
      }
      fits++;
      // Normal equations lose the square of the design's condition; ten terms and a few roundings each.
      const loss = 100 * EPSILON * want.condition ** 2;
      expect(loss).toBeLessThan(1e-7);
      const most = Math.max(...want.coefficients.map((one) => Math.max(...one.map(Math.abs))), 4);
      for (let c = 0; c < dims; c++) {
        expect(Math.abs(value[c] - want.value[c])).toBeLessThan(loss * most);
        for (let axis = 0; axis < dims; axis++)
          expect(Math.abs(slope[c][axis] - want.slope[c][axis])).toBeLessThan((loss * most) / RADIUS);
      }
      expect(Math.abs(flow.weight / want.weight - 1)).toBeLessThan(1000 * EPSILON);
      expect(Math.abs(flow.leverage / want.leverage - 1)).toBeLessThan(loss);
      // It is what is left of the squared velocities, about 10 a link.
      expect(Math.abs(flow.residual - want.residual)).toBeLessThan(loss * 12 * want.weight);
      // Links are at most as sure as one: their own scatter spreads into the value by less than is said.
      expect(want.variance).toBeLessThanOrEqual(flow.leverage);
    }
    expect(fits).toBeGreaterThan(7);
  });

  it.each(CASES)('of an exact quadratic misses it by the ridge and by nothing else: %d-D, %d links', (dims, count) => {
    const depth = dims === 3 ? DEPTH_NOISE : 1;
    const ridge = ridgeOf(dims, LINEAR, QUADRATIC);
    for (let trial = 0; trial < 8; trial++) {
      const about: Place = [0.3 * trial - 1, 0.5, dims === 3 ? -0.7 : 0];
      const { coefficients, velocity } = quadratic(dims, about, `${dims} ${count} ${trial}`);
      const links = scattered(dims, count, `exact ${count} ${trial}`, velocity);
      // One at least is near.
      const close: Place = [about[0] + 1, about[1], about[2]];
      links.push({ at: close, velocity: velocity(close), trust: 1 });
      const flow = flowOf(dims, links);
      const { value } = read(flow, dims, about);
      // (N + R) c = N c' gives c' - c = (N + R)^-1 R c', R the ridge: that is itself a fit of nothing seen at the
      // links and R^1/2 c' seen at the ridge rows. Cauchy-Schwarz in the metric of N + R >= R bounds its first
      // component by the root of leverage times c' R c'.
      const want = ridgeFit(dims, links, about, RADIUS, depth, ridge)!;
      for (let c = 0; c < dims; c++) {
        const penalty = coefficients[c].reduce((sum, one, m) => sum + ridge[m] * one * one, 0);
        const bound = Math.sqrt(flow.leverage * penalty);
        const missed = Math.abs(value[c] - coefficients[c][0]);
        expect(missed).toBeLessThanOrEqual(bound);
        expect(Math.abs(value[c] - want.value[c])).toBeLessThan(1000 * EPSILON * want.condition ** 2);
      }
      // The least of the penalised sum is at most what the true quadratic costs, which leaves no residual.
      const all = coefficients.reduce(
        (sum, one, c) => sum + one.reduce((s, k, m) => s + ridge[m] * k * k, 0) / (c === 2 ? depth * depth : 1),
        0,
      );
      expect(flow.residual).toBeLessThanOrEqual(all * (1 + 1e-9));
    }
  });

  it.each([
    [2, 90],
    [3, 260],
  ] as const)('of an exact quadratic is the quadratic itself where the ridge is as nothing: %d-D', (dims, count) => {
    const about: Place = [0.4, -0.6, dims === 3 ? 0.9 : 0];
    const { coefficients, velocity } = quadratic(dims, about, `sure ${dims}`);
    const links = scattered(dims, count, 'sure', velocity);
    const size = [RADIUS, RADIUS, RADIUS * DEPTH_NOISE];
    // As if every link had been seen `times` times: the error falls as 1 / times down to rounding.
    const errorAt = (times: number) => {
      const { value, slope } = read(flowOf(dims, links, times), dims, about);
      let worst = 0;
      for (let c = 0; c < dims; c++) {
        worst = Math.max(worst, Math.abs(value[c] - coefficients[c][0]));
        for (let axis = 0; axis < dims; axis++)
          worst = Math.max(worst, Math.abs(slope[c][axis] * size[axis] - coefficients[c][1 + axis]));
      }
      return worst;
    };
    const once = errorAt(1);
    expect(once).toBeGreaterThan(1e-6);
    expect(errorAt(1e3) / once).toBeGreaterThan(0.0009);
    expect(errorAt(1e3) / once).toBeLessThan(0.0015);
    expect(errorAt(1e12)).toBeLessThan(1e-12 * once + 1e4 * EPSILON);
  });

  it('of a uniform flow is that flow, however few links there are and however they lie', () => {
    for (const dims of [2, 3] as const) {
      for (const count of [1, 2, 5, 60]) {
        const links = scattered(dims, count, `uniform ${count}`, () => [1.7, -0.3, dims === 3 ? 0.25 : 0]);
        const flow = flowOf(dims, links);
        const about: Place = [links[0].at[0] + 0.2, links[0].at[1] - 0.1, links[0].at[2]];
        const { value, slope } = read(flow, dims, about);
        const want = [1.7, -0.3, 0.25];
        for (let c = 0; c < dims; c++) {
          // Condition at most (sum of weights, links at most) over the least ridge.
          expect(Math.abs(value[c] - want[c])).toBeLessThan(((100 * count) / LINEAR) * EPSILON);
          for (const one of slope[c]) expect(Math.abs(one)).toBeLessThan(((100 * count) / LINEAR) * EPSILON);
        }
      }
    }
  });
});

describe('where particles crowd', () => {
  it.each([
    [120, 1],
    [121, Math.sqrt(120 / 121)],
    [480, 1 / 2],
    [1920, 1 / 4],
  ])('of %d neighbours in the plane those within %f of the radius are fitted, about 120', (count, drawn) => {
    // All within the radius about the origin, evenly.
    const random = randomStream(45, `crowd ${count}`);
    const links = Array.from({ length: count }, (): SeenLink => {
      const [r, angle] = [0.999 * RADIUS * Math.sqrt(random.uniform()), 2 * Math.PI * random.uniform()];
      const velocity: Place = [random.normal(), random.normal(), 0];
      return { at: [r * Math.cos(angle), r * Math.sin(angle), 0], velocity, trust: 0.5 + 0.5 * random.uniform() };
    });
    const flow = flowOf(2, links);
    const into = new Float64Array(3);
    flow.along(0, 0, 0, 0, 0, 0, 0, -1, into);
    const want = ridgeFit(2, links, [0, 0, 0], drawn * RADIUS, 1, ridgeOf(2, LINEAR, QUADRATIC))!;
    const loss = 1000 * EPSILON * want.condition ** 2;
    for (const c of [0, 1]) expect(Math.abs(into[c] - want.value[c])).toBeLessThan(loss);
    expect(Math.abs(flow.weight / want.weight - 1)).toBeLessThan(loss);
    expect(Math.abs(flow.leverage / want.leverage - 1)).toBeLessThan(loss);
    // Of 120 within the radius the mean weight is 1/3 times the mean trust of 3/4: 30, spread by about 3.
    expect(Math.abs(flow.weight - 30)).toBeLessThan(12);
    // Gradients are per length, not per radius.
    const ux = into[0];
    flow.along(1, 0, 0, 0, 0, 0, 0, -1, into);
    expect(Math.abs(into[0] - ux - want.slope[0][0])).toBeLessThan(loss);
  });
});

describe('sums of the fit', () => {
  it.each([2, 3] as const)('are those of the definition, term by term: %d-D', (dims) => {
    const random = randomStream(44, `sums ${dims}`);
    const depth = dims === 3 ? DEPTH_NOISE : 1;
    const velocity = (): Place => [random.normal(), random.normal(), dims === 3 ? random.normal() : 0];
    const spread = scattered(dims, 50, 'sums', velocity);
    const links = spread.map((link) => ({ ...link, at: link.at.map((x) => 0.6 * x) as Place }));
    const column = (of: (link: SeenLink) => number) => Float64Array.from(links, of);
    const columns = {
      x: column(({ at }) => at[0]),
      y: column(({ at }) => at[1]),
      z: column(({ at }) => at[2]),
      u: column(({ velocity }) => velocity[0]),
      v: column(({ velocity }) => velocity[1]),
      w: column(({ velocity }) => velocity[2]),
      trust: column(({ trust }) => trust),
      tag: Int32Array.from(links, (_, n) => n % 25),
    };
    const terms = TERMS[dims];
    // What an earlier fit has left there must not matter.
    const matrix = new Float64Array(terms * terms).fill(7);
    const right = new Float64Array(4 * terms).fill(7);
    // Every third row, links out of reach among them; both links of tag 6 left out.
    const near = Int32Array.from({ length: 17 }, (_, n) => 3 * n);
    const place = Float64Array.of(0.3, -0.4, dims === 3 ? 0.5 : 0);
    const squares = sumAbout(dims, columns, near, 17, place, 1 / RADIUS, 1 / (RADIUS * depth), 6, matrix, right);
    const wantMatrix = new Float64Array(terms * terms);
    const wantRight = new Float64Array(4 * terms);
    let wantSquares = 0;
    let taken = 0;
    for (const row of near) {
      const { at, velocity, trust } = links[row];
      const d = [0, 1, 2].map((axis) => (at[axis] - place[axis]) / (axis === 2 ? RADIUS * depth : RADIUS));
      const inside = 1 - d[0] ** 2 - d[1] ** 2 - d[2] ** 2;
      if (row % 25 === 6 || inside <= 0) continue;
      taken++;
      const g = inside * inside * trust;
      const f = quadraticTerms(dims, d[0], d[1], d[2]);
      for (let m = 0; m < terms; m++) {
        for (let k = m; k < terms; k++) wantMatrix[m * terms + k] += g * f[m] * f[k];
        for (let c = 0; c < dims; c++) wantRight[4 * m + c] += g * f[m] * velocity[c];
      }
      wantSquares += g * (velocity[0] ** 2 + velocity[1] ** 2 + (velocity[2] / depth) ** 2);
    }
    expect(taken).toBeGreaterThan(4);
    expect(taken).toBeLessThan(16);
    const tolerance = 20 * 17 * EPSILON;
    expect(Math.abs(squares - wantSquares)).toBeLessThan(tolerance * 10);
    for (let m = 0; m < terms; m++) {
      for (let k = m; k < terms; k++)
        expect(Math.abs(matrix[m * terms + k] - wantMatrix[m * terms + k])).toBeLessThan(tolerance);
      for (let c = 0; c < dims; c++)
        expect(Math.abs(right[4 * m + c] - wantRight[4 * m + c])).toBeLessThan(tolerance * 4);
    }
  });
});
