import { MedianScreen } from '@wakeloom/tracker/screening/normalised-median';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { describe, expect, it } from 'vitest';

interface Field {
  readonly dims: 2 | 3;
  readonly samples: number;
  /** Velocity at a place, fluctuation not included. */
  readonly mean: (x: number, y: number) => readonly [number, number, number];
  /** Standard deviation of a fluctuation without any correlation between samples. */
  readonly fluctuation: number;
  /** Share of velocities replaced by others, evenly within `range` of zero. */
  readonly replaced: number;
  readonly range: number;
  /** Standard error of the velocities as stated, and as it is. */
  readonly noise: number;
}

/** Share of the good samples that are set aside, and of the replaced ones; mean square of u over the rest. Spacing 1. */
function screened(field: Field, seed: string) {
  const { dims, samples: n, noise } = field;
  const random = randomStream(101, seed);
  const side = dims === 2 ? Math.sqrt(n) : Math.cbrt(n);
  const place = () => Float64Array.from({ length: n }, () => side * random.uniform());
  const columns = {
    dims,
    x: place(),
    y: place(),
    z: dims === 3 ? place() : new Float64Array(0),
    u: new Float32Array(n),
    v: new Float32Array(n),
    w: new Float32Array(dims === 3 ? n : 0),
    root: new Float32Array(n).fill(1),
  };
  const replaced = new Uint8Array(n);
  for (let i = 0; i < n; i++) {
    const mean = field.mean(columns.x[i]!, columns.y[i]!);
    if (random.uniform() < field.replaced) replaced[i] = 1;
    for (const [axis, column] of [columns.u, columns.v, columns.w].slice(0, dims).entries()) {
      const good = mean[axis]! + field.fluctuation * random.normal() + noise * random.normal();
      const other = field.range * (2 * random.uniform() - 1);
      column[i] = replaced[i] === 1 ? other : good;
    }
  }
  const screen = new MedianScreen({ threshold: 2, neighbours: 8, epsilon: null, noise: [noise, noise, noise] });
  const flags = new Uint8Array(n);
  const rows = Uint32Array.from({ length: n }, (_, i) => i);
  screen.judge(columns, rows, n, n, flags, 1);
  const counts = [0, 0];
  const failed = [0, 0];
  for (let i = 0; i < n; i++) {
    const kind = replaced[i]!;
    counts[kind]!++;
    failed[kind]! += flags[i]!;
  }
  let kept = 0;
  let sum = 0;
  for (let i = 0; i < n; i++) {
    if (flags[i] !== 0) continue;
    kept++;
    sum += columns.u[i]! * columns.u[i]!;
  }
  return { good: failed[0]! / counts[0]!, found: failed[1]! / counts[1]!, square: sum / kept };
}

const still = () => [0, 0, 0] as const;
const shear = (slope: number) => (_x: number, y: number) => [slope * y, 0, 0] as const;
const base: Field = { dims: 2, samples: 20_000, mean: still, fluctuation: 0, replaced: 0, range: 0, noise: 0.1 };

describe('what the screen sets aside', () => {
  it.each([2, 3] as const)(
    'fluctuations without correlation, %i-D: at most 0.02 of the samples, their mean square within 0.05',
    (dims) => {
      const { good, square } = screened({ ...base, dims, fluctuation: 3 }, `turbulence ${dims}`);
      expect(good).toBeLessThan(0.02);
      // 9 and the noise; five standard deviations of a mean square over 20 000.
      expect(square / 9.01).toBeGreaterThan(0.95 - 5 * Math.sqrt(2 / 20_000));
    },
  );

  it.each([0, 0.02, 0.3, 2])('clean shear of %f: at most 0.005', (slope) => {
    for (const noise of [1e-9, 0.1]) {
      const { good } = screened({ ...base, mean: shear(slope), noise }, `shear ${slope}`);
      expect(good).toBeLessThan(0.005);
    }
  });

  it.each([
    ['in a uniform stream', { mean: () => [5, 0, 0] as const, range: 10 }],
    ['in shear', { mean: shear(0.1), range: 20 }],
    ['in a vortex', { mean: (x: number, y: number) => [0.1 * (y - 70), 0.1 * (70 - x), 0] as const, range: 10 }],
    ['in a volume', { dims: 3 as const, mean: () => [5, 0, 0] as const, range: 10 }],
    ['in fluctuations', { fluctuation: 0.5, range: 20 }],
  ] as const)('0.05 replaced velocities %s: at least 0.9 of them found, hardly any other with them', (name, change) => {
    const { good, found } = screened({ ...base, ...change, replaced: 0.05 }, name);
    expect(found).toBeGreaterThan(0.9);
    expect(good).toBeLessThan(0.02);
  });
});
