import { mkdtempSync, readdirSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { potentialCylinder } from '@wakeloom/tracker/synthesis/flows-bodies';
import { solidRotation, uniformFlow } from '@wakeloom/tracker/synthesis/flows-elementary';
import { afterAll, describe, expect, it } from 'vitest';
import { barOf, judgeRisk } from '../../bench/linking/bars';
import * as cases from '../../bench/linking/cases';
import { FLOW_CASES } from '../../bench/linking/flows';
import { madeTruth } from '../../bench/linking/made-truth';
import { linkToNearest } from '../../bench/linking/nearest-linker';
import { chosenCases, readOptions } from '../../bench/linking/options.mjs';
import { addLinks, addPool, emptyPool, summarise } from '../../bench/linking/risk-pool';
import { compactTable, fullTable } from '../../bench/linking/tables.mjs';
import { linkByTrueFlow } from '../../bench/linking/true-flow-linker';
import { cached } from '../../bench/linking/truth-cache';
import { scoreLinks } from '../helpers/score-links';
import { truthBlock, truthDump } from '../helpers/truth';

const root = fileURLToPath(new URL('../..', import.meta.url));
const { USUAL } = cases;

describe('dumps of the harness', () => {
  it.each(FLOW_CASES.map(({ name }) => name))('%s: moves as far in a frame as asked for', async (flow) => {
    const one = { ...USUAL, flow, ratio: 0.4, seed: 5, perFrame: 1000, frames: 8, noise: 0.001, losses: 0, ghosts: 0 };
    const { block, particle, spacing } = await madeTruth(one, { root, cache: null });
    const ratios: number[] = [];
    const before = new Map<number, number>();
    for (let row = 0; row < particle.length; row++) {
      const last = before.get(particle[row]);
      if (last !== undefined) {
        const [dx, dy] = [block.x[row] - block.x[last], block.y[row] - block.y[last]];
        ratios.push(Math.hypot(dx, dy, block.dims === 3 ? block.z[row] - block.z[last] : 0) / spacing);
      }
      before.set(particle[row], row);
    }
    const mean = ratios.reduce((sum, ratio) => sum + ratio, 0) / ratios.length;
    const spread = Math.sqrt(ratios.reduce((sum, ratio) => sum + (ratio - mean) ** 2, 0) / ratios.length);
    // A thousand particles sample the field; a chord is shorter than its arc, fast ones leave unseen: 4 %.
    expect(Math.abs(mean / 0.4 - 1)).toBeLessThan(0.04 + (4 * spread) / 0.4 / Math.sqrt(1000));
    const fluid = block.dims === 3 ? 1 : 1 - solidShare(flow);
    const sides = FLOW_CASES.find(({ name }) => name === flow)!.box.map(([low, high]) => high - low);
    const size = fluid * sides.reduce((product, side) => product * side, 1);
    expect(Math.abs((1000 * spacing ** block.dims) / size - 1)).toBeLessThan(0.001);
  });

  it('are the same for the same case, and share the true motion where only the detecting differs', async () => {
    const one = { ...USUAL, flow: 'channel', ratio: 0.3, seed: 5, perFrame: 300, frames: 5 };
    const places = { root, cache: null };
    const [first, again] = [await madeTruth(one, places), await madeTruth(one, places)];
    expect(again.block).toEqual(first.block);
    const noisy = await madeTruth({ ...one, noise: 0.3 }, places);
    expect(new Set(noisy.particle)).toEqual(new Set(first.particle));
    expect(noisy.block.x).not.toEqual(first.block.x);
    expect((await madeTruth({ ...one, seed: 6 }, places)).block.x).not.toEqual(first.block.x);
  });

  it('hold image pairs: two frames a segment, no particle in two of them', async () => {
    const one = { ...USUAL, flow: 'cellular', ratio: 0.6, seed: 1, perFrame: 200, frames: 6, pairs: true };
    const { block, particle, rate } = await madeTruth(one, { root, cache: null });
    expect([...block.segment]).toEqual([0, 0, 1, 1, 2, 2]);
    expect(block.time[1] - block.time[0]).toBeCloseTo(1 / rate, 12);
    expect(block.time[2] - block.time[0]).toBeCloseTo(100 / rate, 9);
    const of = (frame: number) =>
      new Set(particle.subarray(block.offsets[frame], block.offsets[frame + 1]).filter((id) => id >= 0));
    expect([...of(0)].filter((id) => of(1).has(id)).length).toBeGreaterThan(150);
    for (const id of of(2)) expect(of(1).has(id) || of(0).has(id)).toBe(false);
  });
});

/** Area of the cylinder in view over that of the view. */
function solidShare(flow: string): number {
  const radius = { cylinder: 8, wake: 5, 'wake-wide': 2.5 }[flow] ?? 0;
  return (Math.PI * radius * radius) / (64 * 51.2);
}

describe('the linkers beside ours', () => {
  const box = [
    [0, 40],
    [0, 40],
  ] as const;
  const spacing = 1;
  const usual = { frames: 12, rate: 1, perFrame: 1600, box, lossShare: 0.05, noise: 0.005, seed: 3, steps: 6 };
  const oracle = { noise: 0.005, depthNoise: 3, bridge: 2, steps: 4 };

  it('one is told the flow: hardly an error at any displacement, over missing frames too', () => {
    // 1.6 spacings a frame, and a turn of 0.1 a frame: up to two spacings.
    for (const flow of [uniformFlow(1.5, 0.6), solidRotation(0.1, 20, 20)]) {
      const dump = truthDump({ ...usual, flow });
      const block = truthBlock(dump);
      const score = scoreLinks(linkByTrueFlow(block, { ...oracle, flow }), dump.particle, dump.frame, 2);
      // Another detection within a few hundredths of a spacing is nearer by chance: 4 pi 0.005^2 a link and less.
      expect(score.true).toBeGreaterThan(12_000);
      expect(score.precision).toBeGreaterThan(0.998);
      expect(score.recall).toBeGreaterThan(0.998);
      const nearest = scoreLinks(linkToNearest(block, 0.5 * spacing, 2), dump.particle, dump.frame, 2);
      expect(nearest.recall).toBeLessThan(0.3);
    }
  });

  it('told another flow it finds next to nothing', () => {
    const dump = truthDump({ ...usual, flow: uniformFlow(0.4, 0) });
    const pathline = linkByTrueFlow(truthBlock(dump), { ...oracle, flow: uniformFlow(-0.4, 0) });
    expect(scoreLinks(pathline, dump.particle, dump.frame, 2).recall).toBeLessThan(0.01);
  });

  it('the nearest: right while displacements are small, wrong as a Poisson field says', () => {
    const dump = truthDump({ ...usual, lossShare: 0, flow: uniformFlow(0.1, 0) });
    const score = scoreLinks(linkToNearest(truthBlock(dump), 0.5, 0), dump.particle, dump.frame, 0);
    // The right pair is refused where a nearer one takes its detection or its pathline: each with probability
    // 1 - exp(-pi 0.01) = 0.031 (Hertz 1909), at most both. Five standard deviations of 17 000 links: 0.009.
    const either = 2 * (1 - Math.exp(-0.01 * Math.PI));
    expect(score.precision).toBeGreaterThan(1 - either - 0.009);
    expect(score.precision).toBeLessThan(1 - 0.25 * either);
  });

  it('the nearest takes pairs in order of distance, each detection once, none beyond its reach, and waits', () => {
    const frames = [[0, 1, 5], [0.4, 1.05], [], [5.2, 3]];
    const x = Float64Array.from(frames.flat());
    const offsets = Uint32Array.of(0, 3, 5, 5, 7);
    const block = {
      ...truthBlock(truthDump({ ...usual, frames: 1, perFrame: 1, flow: potentialCylinder(1, 0.1) })),
      number: Int32Array.of(0, 1, 2, 3),
      time: Float64Array.of(0, 1, 2, 3),
      segment: new Int32Array(4),
      offsets,
      x,
      y: new Float64Array(x.length),
    };
    const pathline = linkToNearest(block, 0.5, 2);
    // 1 takes 1.05 before 0 could; 0 takes 0.4; 5 waits two frames for 5.2; 3 begins.
    expect([...pathline]).toEqual([0, 1, 2, 0, 1, 2, 3]);
    expect([...linkToNearest(block, 0.5, 1)].slice(5)).toEqual([3, 4]);
    block.segment.set([0, 0, 1, 1]);
    expect([...linkToNearest(block, 0.5, 2)].slice(5)).toEqual([3, 4]);
  });
});

describe('links by their stated risk', () => {
  it('are counted by decade, on the later row of each link that counts', () => {
    const pool = emptyPool();
    // Rows 1, 2 and 3 are links; that of row 2 is wrong. Row 0 begins, row 4 does not count.
    const made = Int32Array.of(-1, 0, 1, 2, -1);
    const truth = Int32Array.of(-1, 0, -1, 2, 3);
    addLinks(pool, made, truth, [0.9, 0.002, 0.3, 0.00005, 0.7]);
    const { decades, expected, wrong, areaUnderCurve } = summarise(pool);
    const counted = decades.map(({ from, to, links, wrong: bad }) => [from, to, links, bad]);
    expect(counted).toEqual([
      [0, 1e-5, 0, 0],
      [1e-5, 1e-4, 1, 0],
      [1e-4, 1e-3, 0, 0],
      [1e-3, 1e-2, 1, 0],
      [1e-2, 1e-1, 0, 0],
      [1e-1, 1, 1, 1],
    ]);
    expect(expected).toBeCloseTo(0.30205, 12);
    expect([wrong, areaUnderCurve]).toEqual([1, 1]);
    const both = emptyPool();
    addPool(both, pool);
    addPool(both, pool);
    expect(summarise(both).wrong).toBe(2);
    expect(() => addLinks(pool, made, truth, [0, 1.5, 0, 0, 0])).toThrow('probability');
  });

  it('give the area under the curve with ties by half', () => {
    const pool = emptyPool();
    // Risks of wrong links 0.5 and 0.1, of right ones 0.1 and 0.01: pairs won 1, 1, 1/2 and 1 of 4.
    addLinks(pool, Int32Array.of(0, 0, 0, 0), Int32Array.of(-1, -1, 0, 0), [0.5, 0.1, 0.1, 0.01]);
    expect(summarise(pool).areaUnderCurve).toBe(3.5 / 4);
  });

  it('are held against bars', () => {
    const decade = { from: 1e-2, to: 1e-1, links: 4000, expected: 200, wrong: 200 };
    const good = { decades: [decade], areaUnderCurve: 0.95, expected: 200, wrong: 200 };
    const riskMisses = (summary: typeof good) => judgeRisk(summary).misses;
    expect(riskMisses(good)).toEqual([]);
    expect(judgeRisk(good).decades[0].verdict).toBe('met');
    expect(riskMisses({ ...good, decades: [{ ...decade, wrong: 301 }] })).toHaveLength(1);
    expect(riskMisses({ ...good, decades: [{ ...decade, wrong: 133 }] })).toHaveLength(1);
    expect(riskMisses({ ...good, decades: [{ ...decade, expected: 99, wrong: 0 }] })).toEqual([]);
    expect(riskMisses({ ...good, areaUnderCurve: 0.89 })).toHaveLength(1);
    expect(riskMisses({ ...good, areaUnderCurve: Number.NaN })).toHaveLength(1);
    expect(riskMisses({ ...good, expected: 231 })).toHaveLength(1);
    expect(riskMisses({ ...good, expected: 169 })).toHaveLength(1);
  });
});

describe('cases and bars', () => {
  it('the table has every flow at every ratio, the full set all that is asked for', () => {
    const table = cases.casesOf('table');
    expect(table).toHaveLength(9 * 5 * 2 + 2 * 3 * 2);
    expect(new Set(table.map((one) => JSON.stringify(one))).size).toBe(table.length);
    const full = cases.casesOf('full');
    expect(full.slice(0, table.length)).toEqual(table);
    const values = (name: keyof cases.LinkingCase) => new Set(full.map((one) => one[name]));
    expect(values('noise')).toEqual(new Set([0.05, 0.1, 0.2, 0.3]));
    expect(values('losses')).toEqual(new Set([0, 0.05, 0.15]));
    expect(values('ghosts')).toEqual(new Set([0, 0.05, 0.2]));
    expect(values('perFrame')).toEqual(new Set([1000, 4000, 10_000, 20_000]));
    const seeds = (set: cases.SetName) => new Set(cases.casesOf(set).map(({ seed }) => seed));
    for (const seed of seeds('held-out')) expect(seeds('full').has(seed) || seeds('quick').has(seed)).toBe(false);
  });

  it('bars stand for the usual conditions alone', () => {
    const at = (flow: string, ratio: number, change = {}) => barOf({ ...USUAL, flow, ratio, seed: 1, ...change }).must;
    expect(at('random', 0.3)).toEqual({ precision: 0.998, recall: 0.995 });
    expect(at('abc', 0.6)).toEqual({ precision: 0.995, recall: 0.98 });
    for (const flow of ['street', 'wake', 'channel', 'cylinder']) {
      expect(at(flow, 1)).toEqual({ precision: 0.99, recall: 0.95 });
    }
    for (const flow of ['cellular', 'random', 'random-steep', 'lamb-oseen', 'abc', 'burgers']) {
      expect(at(flow, 1)).toEqual({ precision: 0.98, recall: 0.9 });
    }
    expect(at('street', 1.5)).toBeNull();
    expect(at('street', 0.3, { noise: 0.2 })).toBeNull();
    expect(at('street', 0.3, { care: 'quick' })).toBeNull();
    expect(at('wake', 0.6, { pairs: true, frames: 200 })).toEqual({ precision: 0.98, recall: 0.95 });
  });

  it('options narrow a set or make every combination', () => {
    const chosen = (...words: string[]) => chosenCases(readOptions(words), cases);
    expect(chosen('--flows', 'street,abc', '--ratios', '0.5', '--seeds', '1,2,3')).toHaveLength(6);
    expect(chosen('--set', 'table', '--flows', 'street', '--ratios', '0.3,1')).toHaveLength(4);
    expect(chosen('--pairs', '--flows', 'wake')[0]).toMatchObject({ pairs: true, frames: 200 });
    expect(() => chosen('--flows', 'nowhere')).toThrow('street');
    expect(() => chosen('--ratios', 'fast')).toThrow('expected a number');
    expect(() => chosen('--set', 'all')).toThrow('quick, table');
    expect(() => readOptions(['--risk-by', 'colour'])).toThrow('flow, ratio');
    expect(() => readOptions(['--record', '--set', 'full', '--flows', 'street'])).toThrow('--record');
  });
});

describe('tables', () => {
  const score = (precision: number, recall: number, errors: number) => ({
    precision,
    recall,
    errors,
    made: 1,
    right: 1,
    true: 100_000,
  });
  const one = (flow: string, ratio: number, precision: number, change = {}) => {
    const made = { ...USUAL, flow, ratio, seed: 1, ...change };
    return {
      case: made,
      unusual: cases.unusual(made),
      bar: barOf(made),
      ours: score(precision, 0.999, 0.002),
      oracle: score(0.9999, 0.9999, 0.0005),
      nearest: score(0.5, 0.4, 1),
      detections: 1000,
      linkSeconds: 1,
    };
  };
  const decade = { from: 1e-2, to: 1e-1, links: 4000, expected: 200, wrong: 20 };
  const risk = judgeRisk({ decades: [decade], areaUnderCurve: 0.95, expected: 200, wrong: 200 });
  const record = (list: unknown[]) => ({
    file: 'linking-x.json',
    date: '2020-01-01',
    commit: 'abc',
    changed: false,
    set: 'full',
    seconds: 1,
    machine: { processor: 'p', cores: 2, memoryGigabytes: 8, platform: 'x', node: 'v20' },
    cases: list,
    failed: [],
    flows: [{ name: 'street', why: 'known' }],
    risk,
  });

  it('mark a miss plainly, of any seed', () => {
    const good = one('street', 0.3, 0.9985);
    const bad = one('street', 0.3, 0.9979, { seed: 2 });
    expect(fullTable(record([good]), null)).toContain('| street | 0.3 | 0.9985 / 0.9990 | 0.998 / 0.995 met |');
    const text = fullTable(record([good, bad]), null);
    expect(text).toContain('| street | 0.3 | 0.9979 / 0.9990 | 0.998 / 0.995 **missed** |');
    expect(text).toContain('| 4.0 | 2 times not reached |');
    expect(text).toContain('| 1e-2 to 1e-1 | 4000 | 200.0 | 20 | 0.10 | **missed** |');
    expect(compactTable(record([good]))).toContain('Link risk: 1 of its bars missed');
    expect(compactTable(record([good]))).toContain('All bars met');
    expect(compactTable(record([good, bad]))).toContain('1 of 1 bars missed');
    expect(compactTable(record([good, bad]))).toContain('| street | 0.9979 / 0.9990 **missed** |');
  });

  it('keep what was changed, image pairs and seeds set aside apart', () => {
    const pairs = one('wake', 0.6, 0.97, { pairs: true, frames: 200 });
    const noisy = one('street', 0.3, 0.9, { noise: 0.3 });
    const text = fullTable(record([one('street', 0.3, 0.9985), noisy, pairs]), record([one('wake', 1, 0.95)]));
    expect(text).toContain('| wake, pairs | 0.6 | 0.9700 / 0.9990 | 0.98 / 0.95 **missed** |');
    expect(text).toContain('| noise 0.3 px | 0.9000 / 0.9990 |');
    expect(text.slice(text.indexOf('## Seeds set aside'))).toContain(
      '| wake | 1 | 0.9500 / 0.9990 | 0.99 / 0.95 **missed** |',
    );
  });
});

describe('cache of truth', () => {
  const cache = mkdtempSync(join(tmpdir(), 'wakeloom-truth-'));
  afterAll(() => rmSync(cache, { recursive: true }));

  it('gives back the same columns for the same key and sources, and makes them anew for others', () => {
    let made = 0;
    const make = () => {
      made++;
      return { a: Float64Array.of(1.5, Number.NaN), b: Int32Array.of(-3, made, 7), c: new Uint32Array(0) };
    };
    const places = { root, cache };
    const first = cached(places, { k: 1 }, ['tests/helpers/truth.ts'], make);
    expect(cached(places, { k: 1 }, ['tests/helpers/truth.ts'], make)).toEqual(first);
    expect(made).toBe(1);
    cached(places, { k: 2 }, ['tests/helpers/truth.ts'], make);
    cached(places, { k: 1 }, ['bench/linking/'], make);
    cached({ root, cache: null }, { k: 1 }, ['tests/helpers/truth.ts'], make);
    expect(made).toBe(4);
    expect(readdirSync(cache)).toHaveLength(3);
  });
});
