import { FLAG } from '@wakeloom/tracker/core/columns';
import { createGridAccumulator } from '@wakeloom/tracker/eulerian/accumulate';
import { binIndex, type GridShape } from '@wakeloom/tracker/eulerian/grid';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { mean, sampleCovariance, sampleVariance } from 'simple-statistics';
import { describe, expect, it } from 'vitest';
import { type BinSample, pathlineRows } from '../helpers/pathline-rows.js';

const options = { fewestForMean: 1, fewestForStress: 2, lengthUnit: 'mm', timeUnit: 's' };

/** Bins of one side from the origin on. */
function square(count: number, side: number, overlap = 0): GridShape {
  const step = side * (1 - overlap);
  return {
    dims: 2,
    count: [count, count, 1],
    first: [step / 2, step / 2, 0],
    step: [step, step, 1],
    size: [side, side, 1],
  };
}

describe('grid accumulator', () => {
  it('agrees with simple-statistics on random samples, in every bin, in a volume', () => {
    const random = randomStream(61, 'peer');
    const samples: BinSample[] = Array.from({ length: 3000 }, (_, i) => ({
      // Plain sample statistics: every sample a pathline of its own.
      pathline: i,
      x: 2 * random.uniform(),
      y: 2 * random.uniform(),
      z: 2 * random.uniform(),
      u: 5 + random.normal(),
      v: random.normal() - 3,
      w: 100 + 0.1 * random.normal(),
    }));
    const shape: GridShape = {
      dims: 3,
      count: [2, 2, 2],
      first: [0.5, 0.5, 0.5],
      step: [1, 1, 1],
      size: [1, 1, 1],
    };
    const grid = createGridAccumulator(shape, 3, options);
    grid.add(pathlineRows(samples));
    expect(grid.taken).toBe(3000);
    const result = grid.finish();
    for (let k = 0; k < 2; k++) {
      for (let j = 0; j < 2; j++) {
        for (let i = 0; i < 2; i++) {
          const bin = binIndex(shape, i, j, k);
          const here = samples.filter(
            (one) => Math.floor(one.x) === i && Math.floor(one.y) === j && Math.floor(one.z!) === k,
          );
          const columns = [here.map((one) => one.u), here.map((one) => one.v), here.map((one) => one.w!)];
          const moments = grid.moments(bin);
          expect(result.samples[bin]).toBe(here.length);
          expect(result.pathlines[bin]).toBe(new Set(here.map((one) => one.pathline)).size);
          for (let a = 0; a < 3; a++) {
            expect(moments.mean[a]! / mean(columns[a]!)).toBeCloseTo(1, 12);
            const name = 'uvw'[a]!;
            expect(result.fields.get(name)!.values[bin]).toBe(Math.fround(moments.mean[a]!));
          }
          expect(moments.pairs.length).toBe(6);
          for (const [p, [a, b]] of moments.pairs.entries()) {
            const want = a === b ? sampleVariance(columns[a]!) : sampleCovariance(columns[a]!, columns[b]!);
            const scale = Math.sqrt(sampleVariance(columns[a]!) * sampleVariance(columns[b]!));
            expect(Math.abs(moments.product[p]! - want)).toBeLessThan(1e-11 * scale);
          }
        }
      }
    }
  });

  it('a linear profile across a bin of width h: false turbulence (slope h)^2 / 12', () => {
    const [h, slope, n] = [0.8, 3, 4000];
    const samples = Array.from({ length: n }, (_, i) => {
      const y = (h * (i + 0.5)) / n;
      return { pathline: i, x: 0.1, y, u: slope * y, v: 0 };
    });
    const grid = createGridAccumulator(square(1, h), 2, options);
    grid.add(pathlineRows(samples));
    // Midpoints give (slope h)^2 / 12 (1 - 1/n^2) over n; over n - 1 it is larger by n / (n - 1).
    const want = (((slope * h) ** 2 / 12) * (1 - 1 / n ** 2) * n) / (n - 1);
    expect(grid.moments(0).product[0]! / want).toBeCloseTo(1, 10);
    expect(grid.moments(0).product[2]).toBe(0);
  });

  it('a quadratic profile: the mean is off the centre value by curvature h^2 / 24', () => {
    const [h, n] = [0.5, 2000];
    const profile = (y: number) => 2 + y + 7 * (y - h / 2) ** 2;
    const samples = Array.from({ length: n }, (_, i) => {
      const y = (h * (i + 0.5)) / n;
      return { pathline: i, x: 0.1, y, u: profile(y), v: 0 };
    });
    const grid = createGridAccumulator(square(1, h), 2, options);
    grid.add(pathlineRows(samples));
    const offset = grid.moments(0).mean[0]! - profile(h / 2);
    expect(offset / ((14 * h * h) / 24)).toBeCloseTo(1, 6);
  });

  it('with overlap a sample counts in each bin that covers it, borders below but not above', () => {
    const shape = square(6, 2, 0.5);
    const grid = createGridAccumulator(shape, 2, options);
    // Centres at 0.5, 1.5, 2.5 ..., bins reach 1 to either side: x = 2.1 is covered by centres 1.5 and 2.5.
    grid.add(pathlineRows([{ pathline: 0, x: 2.1, y: 0.2, u: 1, v: 1 }]));
    let result = grid.finish();
    const filled = Array.from(result.samples, (n, bin) => (n > 0 ? bin : -1)).filter((bin) => bin >= 0);
    expect(filled).toEqual([binIndex(shape, 1, 0, 0), binIndex(shape, 2, 0, 0)]);
    // On the border of bins 1 and 3: in 2 and 3, whose lower border it is.
    grid.add(pathlineRows([{ pathline: 0, x: 2.5, y: 0.2, u: 1, v: 1 }]));
    result = grid.finish();
    expect([1, 2, 3].map((i) => result.samples[binIndex(shape, i, 0, 0)])).toEqual([1, 2, 1]);
    expect(grid.taken).toBe(2);
  });

  it('without overlap every sample inside falls into exactly one bin, on borders too', () => {
    const shape = square(30, 0.1);
    const grid = createGridAccumulator(shape, 2, options);
    const samples = Array.from({ length: 3000 }, (_, i) => ({
      pathline: i,
      x: i * 0.001,
      y: 0.1 * (i % 30),
      u: 1,
      v: 1,
    }));
    grid.add(pathlineRows(samples));
    expect(grid.finish().samples.reduce((sum, n) => sum + n, 0)).toBe(grid.taken);
    expect(grid.taken + grid.leftOut.outside).toBe(3000);
    expect(grid.leftOut.outside).toBeLessThanOrEqual(1);
  });

  it('samples within the tolerance beyond the border count in the bins there, others do not', () => {
    for (const overlap of [0, 0.5]) {
      const shape = square(4, 1, overlap);
      const low = shape.first[0] - 0.5;
      const high = shape.first[0] + 3 * shape.step[0] + 0.5;
      const grid = createGridAccumulator(shape, 2, { ...options, tolerance: [0.02, 0.02, 0] });
      const at = (pathline: number, x: number) => ({ pathline, x, y: low + 0.1, u: 1, v: 1 });
      grid.add(
        pathlineRows([at(0, low - 0.019), at(1, high), at(2, high + 0.019), at(3, low - 0.021), at(4, high + 0.021)]),
      );
      expect(grid.taken).toBe(3);
      expect(grid.leftOut.outside).toBe(2);
      const { samples } = grid.finish();
      expect([0, 1, 2, 3].map((i) => samples[binIndex(shape, i, 0, 0)])).toEqual([1, 0, 0, 2]);
    }
  });

  it('leaves out screened samples, counts them, keeps near-end and bridged ones', () => {
    const grid = createGridAccumulator(square(1, 1), 2, options);
    const one = { x: 0.5, y: 0.5, u: 1, v: 2 };
    grid.add(
      pathlineRows([
        { pathline: 0, ...one, flags: FLAG.bridged },
        { pathline: 0, ...one, flags: FLAG['near-end'] },
        { pathline: 1, ...one, flags: FLAG['off-fit'], u: 99 },
        { pathline: 1, ...one, flags: FLAG['off-neighbours'] | FLAG.bridged, u: 99 },
        { pathline: 2, ...one, flags: FLAG.stuck, u: 99 },
        { pathline: 3, ...one, flags: FLAG['doubtful-link'], u: 99 },
        { pathline: 4, ...one, flags: FLAG['against-flow'], u: 99 },
        { pathline: 5, ...one, v: Number.NaN },
        { pathline: 6, ...one, x: -0.01 },
      ]),
    );
    expect(grid.taken).toBe(2);
    expect(grid.leftOut).toEqual({ flagged: 5, noVelocity: 1, outside: 1 });
    expect(grid.finish().samples[0]).toBe(2);
    expect(grid.finish().pathlines[0]).toBe(1);
    expect(grid.finish().fields.get('u')!.values[0]).toBe(1);
  });

  it('bins too thin for a figure are NaN; empty bins too', () => {
    const grid = createGridAccumulator(square(2, 1), 2, { ...options, fewestForMean: 3, fewestForStress: 4 });
    const at = (pathline: number, x: number): BinSample => ({ pathline, x, y: 0.5, u: pathline, v: 1 });
    grid.add(pathlineRows([at(0, 0.5), at(1, 0.5), at(2, 0.5), at(3, 1.5), at(4, 1.5)]));
    const { fields, samples } = grid.finish();
    expect(Array.from(samples)).toEqual([3, 2, 0, 0]);
    expect(Array.from(fields.get('u')!.values)).toEqual([1, Number.NaN, Number.NaN, Number.NaN]);
    for (const name of ['uu', 'uv', 'vv', 'uu_raw', 'uu_se']) {
      expect(Array.from(fields.get(name)!.values).every(Number.isNaN)).toBe(true);
    }
  });

  it('takes the noise part off normal stresses only, and names units and standard errors', () => {
    const grid = createGridAccumulator(square(1, 1), 2, options);
    const random = randomStream(62, 'noise part');
    const samples = Array.from({ length: 50 }, (_, i) => ({
      pathline: i,
      x: 0.5,
      y: 0.5,
      u: random.normal(),
      v: random.normal(),
      uSe: 0.3,
      vSe: i % 2 === 0 ? 0.1 : 0.7,
    }));
    grid.add(pathlineRows(samples));
    const { fields } = grid.finish();
    const value = (name: string) => fields.get(name)!.values[0]!;
    expect(value('uu_raw') - value('uu')).toBeCloseTo(0.09, 6);
    expect(value('vv_raw') - value('vv')).toBeCloseTo(0.25, 6);
    expect(value('uv')).toBe(value('uv_raw'));
    expect([...fields.keys()]).toEqual('u v u_se v_se uu uv vv uu_se uv_se vv_se uu_raw uv_raw vv_raw'.split(' '));
    expect(fields.get('u')!.unit).toBe('mm/s');
    expect(fields.get('uv')!.unit).toBe('mm2/s2');
    for (const [name, field] of fields) {
      expect(field.longName.length).toBeGreaterThan(10);
      if (field.standardError !== null) expect(fields.has(field.standardError)).toBe(true);
      else expect(name.endsWith('_se')).toBe(true);
    }
  });

  it('gives the same bits however the pathlines are cut into calls', () => {
    const random = randomStream(63, 'calls');
    const samples: BinSample[] = Array.from({ length: 400 }, (_, i) => ({
      pathline: Math.floor(i / 9),
      x: 2 * random.uniform(),
      y: 2 * random.uniform(),
      u: random.normal(),
      v: random.normal(),
    }));
    const once = createGridAccumulator(square(4, 1, 0.5), 2, options);
    once.add(pathlineRows(samples));
    const often = createGridAccumulator(square(4, 1, 0.5), 2, options);
    for (let p = 0; p <= 44; p += 3) {
      often.add(pathlineRows(samples.filter((one) => one.pathline >= p && one.pathline < p + 3)));
    }
    const [a, b] = [once.finish(), often.finish()];
    for (const [name, field] of a.fields) expect(b.fields.get(name)!.values).toEqual(field.values);
    expect(b.pathlines).toEqual(a.pathlines);
  });
});

describe('standard errors of a bin', () => {
  it('one sample a pathline: s / sqrt(n), and for a stress the sample deviation of the product over sqrt(n)', () => {
    const random = randomStream(64, 'independent');
    const samples = Array.from({ length: 300 }, (_, i) => {
      const u = 10 + random.normal();
      return { pathline: i, x: 0.5, y: 0.5, u, v: 0.5 * u + random.normal() };
    });
    const grid = createGridAccumulator(square(1, 1), 2, options);
    grid.add(pathlineRows(samples));
    const { meanSe, productSe } = grid.moments(0);
    const [u, v] = [samples.map((one) => one.u), samples.map((one) => one.v)];
    const n = samples.length;
    expect(meanSe[0]! / Math.sqrt(sampleVariance(u) / n)).toBeCloseTo(1, 10);
    expect(meanSe[1]! / Math.sqrt(sampleVariance(v) / n)).toBeCloseTo(1, 10);
    const [mu, mv] = [mean(u), mean(v)];
    const products = {
      uu: u.map((one) => (one - mu) ** 2),
      uv: u.map((one, i) => (one - mu) * (v[i]! - mv)),
      vv: v.map((one) => (one - mv) ** 2),
    };
    for (const [k, name] of (['uu', 'uv', 'vv'] as const).entries()) {
      expect(productSe[k]! / Math.sqrt(sampleVariance(products[name]) / n)).toBeCloseTo(1, 9);
    }
  });

  it('samples of one pathline repeated: no smaller error than one of them gives', () => {
    const random = randomStream(65, 'repeated');
    const values = Array.from({ length: 100 }, () => [random.normal(), random.normal()] as const);
    const bin = (repeats: number) => {
      const grid = createGridAccumulator(square(1, 1), 2, options);
      grid.add(
        pathlineRows(
          values.flatMap(([u, v], pathline) =>
            Array.from({ length: repeats }, () => ({ pathline, x: 0.5, y: 0.5, u, v })),
          ),
        ),
      );
      return grid.moments(0);
    };
    const [once, ten] = [bin(1), bin(10)];
    expect(ten.samples).toBe(1000);
    expect(ten.pathlines).toBe(100);
    expect(ten.meanSe[0]! / once.meanSe[0]!).toBeCloseTo(1, 9);
    expect(ten.productSe[1]! / once.productSe[1]!).toBeCloseTo(1, 9);
    // Nor another stress: ten times the same tells nothing new.
    for (const k of [0, 1, 2]) expect(ten.product[k]! / once.product[k]!).toBeCloseTo(1, 9);
  });

  it('correlated pathlines: 95 % intervals of means and stresses cover the truth over 2000 bins', () => {
    const random = randomStream(66, 'coverage');
    const bins = 2000;
    let mean95 = 0;
    let uu95 = 0;
    let uv95 = 0;
    let naive95 = 0;
    for (let b = 0; b < bins; b++) {
      const samples: BinSample[] = [];
      for (let pathline = 0; pathline < 60; pathline++) {
        // Part of the fluctuation belongs to the pathline: u = a + e, variances 1 and 1; v = 0.5 u + f.
        const a = random.normal();
        const length = 1 + (pathline % 5);
        for (let k = 0; k < length; k++) {
          const u = a + random.normal();
          samples.push({ pathline, x: 0.5, y: 0.5, u: 7 + u, v: 0.5 * u + random.normal() });
        }
      }
      const grid = createGridAccumulator(square(1, 1), 2, options);
      grid.add(pathlineRows(samples));
      const m = grid.moments(0);
      // Student t, 59 degrees of freedom, two-sided 95 %: 2.00 (60: 2.000298, check table of the t distribution).
      if (Math.abs(m.mean[0]! - 7) <= 2.0003 * m.meanSe[0]!) mean95++;
      if (Math.abs(m.mean[0]! - 7) <= 1.96 * Math.sqrt(m.product[0]! / m.samples)) naive95++;
      if (Math.abs(m.product[0]! - 2) <= 2.0003 * m.productSe[0]!) uu95++;
      if (Math.abs(m.product[1]! - 1) <= 2.0003 * m.productSe[1]!) uv95++;
    }
    const band = 4 * Math.sqrt((0.95 * 0.05) / bins);
    // Lengths of pathlines differ, which costs clusters: intervals are a little short, by about 1 %.
    expect(Math.abs(mean95 / bins - 0.95)).toBeLessThan(band + 0.01);
    // Squares are skew: intervals symmetric about the estimate cover less, for 60 pathlines by about 2 %.
    expect(Math.abs(uu95 / bins - 0.95)).toBeLessThan(band + 0.02);
    expect(Math.abs(uv95 / bins - 0.95)).toBeLessThan(band + 0.02);
    // Taking the 180 samples as independent covers the mean far less often.
    expect(naive95 / bins).toBeLessThan(0.87);
  });
});
