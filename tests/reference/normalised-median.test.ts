import { FLAG } from '@wakeloom/tracker/core/columns';
import { MedianScreen, normalisedMedianResidual } from '@wakeloom/tracker/screening/normalised-median';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { median } from 'simple-statistics';
import { describe, expect, it } from 'vitest';

// Westerweel & Scarano (2005), Exp. Fluids 39, 1096-1100: |u0 - um| / (rm + epsilon), epsilon about 0.1 px, threshold 2.
const NEIGHBOURS = [1.0, 1.1, 0.9, 1.05, 0.95, 1.0, 1.2, 0.8];
const EPSILON = 0.1;

function residual(centre: number, neighbours: readonly number[]): number {
  const values = Float64Array.from(neighbours);
  return normalisedMedianResidual(centre, values, values.length, EPSILON);
}

/** One sample at the origin with velocity `centre` along x, eight round it on a ring; true where it is rejected. */
function rejected(centre: number, neighbours: readonly number[]): boolean {
  const n = neighbours.length + 1;
  const columns = {
    dims: 2 as const,
    x: Float64Array.from({ length: n }, (_, i) => (i === 0 ? 0 : Math.cos((i * Math.PI) / 4))),
    y: Float64Array.from({ length: n }, (_, i) => (i === 0 ? 0 : Math.sin((i * Math.PI) / 4))),
    z: new Float64Array(0),
    u: Float32Array.of(centre, ...neighbours),
    v: new Float32Array(n),
    w: new Float32Array(0),
    root: new Float32Array(n),
  };
  const screen = new MedianScreen({ threshold: 2, neighbours: 8, epsilon: EPSILON, noise: [0, 0, 0] });
  const flags = new Uint8Array(n);
  const rows = Uint32Array.from({ length: n }, (_, i) => i);
  screen.judge(columns, rows, n, 1, flags, 1);
  return flags[0] === 1;
}

describe('normalised median test', () => {
  it('worked example: um 1.0, rm 0.075; centre 2.0 gives 5.714286, centre 1.3 gives 1.714286', () => {
    expect(residual(2.0, NEIGHBOURS)).toBeCloseTo(5.714286, 6);
    expect(residual(1.3, NEIGHBOURS)).toBeCloseTo(1.714286, 6);
    // um + rm + epsilon gives 1.
    expect(residual(1.0 + 0.075 + 0.1, NEIGHBOURS)).toBeCloseTo(1, 12);
  });

  it('agrees with sorting the deviations, for odd and even numbers of neighbours', () => {
    const random = randomStream(30, 'deviations');
    for (let n = 4; n < 20; n++) {
      for (let trial = 0; trial < 20; trial++) {
        const neighbours = Array.from({ length: n }, () => Math.round(4 * random.normal()) / 2);
        const middle = median(neighbours);
        const spread = median(neighbours.map((value) => Math.abs(value - middle)));
        const want = Math.abs(3 - middle) / (spread + EPSILON);
        expect(residual(3, neighbours)).toBeCloseTo(want, 12);
      }
    }
  });

  it('neighbours all equal: epsilon decides, deviations above 0.2 px are rejected', () => {
    const equal = new Array<number>(8).fill(1);
    expect(residual(1.21, equal)).toBeGreaterThan(2);
    expect(residual(1.19, equal)).toBeLessThan(2);
  });

  it('the screen rejects and keeps the same on a ring of neighbours', () => {
    expect(rejected(2.0, NEIGHBOURS)).toBe(true);
    expect(rejected(1.3, NEIGHBOURS)).toBe(false);
    const equal = new Array<number>(8).fill(1);
    expect(rejected(1.21, equal)).toBe(true);
    expect(rejected(1.19, equal)).toBe(false);
  });
});

describe('the screen on scattered samples', () => {
  /** 1500 samples of a velocity field with noise 0.05, a few of them spoilt. */
  function judge(field: (x: number, y: number) => readonly [number, number], spoilt: number) {
    const random = randomStream(31, 'scattered');
    const n = 1500;
    const columns = {
      dims: 2 as const,
      x: Float64Array.from({ length: n }, () => 40 * random.uniform()),
      y: Float64Array.from({ length: n }, () => 40 * random.uniform()),
      z: new Float64Array(0),
      u: new Float32Array(n),
      v: new Float32Array(n),
      w: new Float32Array(0),
      root: new Float32Array(n).fill(1),
    };
    for (let i = 0; i < n; i++) {
      const [u, v] = field(columns.x[i]!, columns.y[i]!);
      columns.u[i] = u + 0.05 * random.normal() + (i < spoilt ? 2 : 0);
      columns.v[i] = v + 0.05 * random.normal();
    }
    const screen = new MedianScreen({ threshold: 2, neighbours: 8, epsilon: null, noise: [0.05, 0.05, Number.NaN] });
    const flags = new Uint8Array(n);
    const rows = Uint32Array.from({ length: n }, (_, i) => i);
    screen.judge(columns, rows, n, n, flags, FLAG['off-neighbours']);
    const bad = Array.from(flags, (flag) => flag !== 0);
    return { caught: bad.slice(0, spoilt).filter(Boolean).length, false: bad.slice(spoilt).filter(Boolean).length };
  }

  it('steep shear without outliers: at most 1.5 % rejected (the plain test alone rejects several per cent)', () => {
    // 0.3 per length over spacings of 1.03: six noise standard deviations from neighbour to neighbour.
    const { false: rejects } = judge((_, y) => [0.3 * y, 0], 0);
    expect(rejects / 1500).toBeLessThan(0.015);
  });

  it('outliers of 2 are caught in a uniform stream and in steep shear', () => {
    for (const slope of [0, 0.3]) {
      const { caught, false: rejects } = judge((_, y) => [1 + slope * y, 0], 30);
      expect(caught).toBeGreaterThanOrEqual(27);
      expect(rejects / 1470).toBeLessThan(0.02);
    }
  });
});
