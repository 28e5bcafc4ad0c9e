import type { DetectionBlock } from '@wakeloom/tracker';
import { describe, expect, it } from 'vitest';
import { calibrated, copyBlock, randomBlock, scaleGeometry, settingsWith, shuffled } from '../helpers/detections.js';

const BASE = {
  scale: { value: 0.05, unit: 'mm/px', standardUncertainty: 0 },
  origin: [512.25, 403.5, 12] as const,
};
const turned = (value: number) => ({ value, unit: 'deg', standardUncertainty: null });

/** Positions by `row`, so that the order of a frame does not matter. */
async function byRow(parts: Parameters<typeof scaleGeometry>[0], block: DetectionBlock) {
  const settings = settingsWith({ geometry: scaleGeometry({ ...BASE, ...parts }) });
  const { block: after } = await calibrated(settings, block);
  const x = new Float64Array(after.x.length);
  const y = new Float64Array(after.y.length);
  for (const [i, row] of after.row.entries()) {
    x[row] = after.x[i]!;
    y[row] = after.y[i]!;
  }
  return { x, y, after };
}

const negated = (values: Float64Array) => values.map((value) => 0 - value);

describe('symmetries of calibration', () => {
  const block = randomBlock(2, [400, 300], 41);

  it('mirrors to the bit', async () => {
    const plain = await byRow({}, block);
    const down = await byRow({ yAxis: 'down' }, block);
    expect(down.x).toEqual(plain.x);
    expect(down.y).toEqual(negated(plain.y));
  });

  it.each([1, 2, 3])('turns by %i quarters to the bit', async (quarters) => {
    const plain = await byRow({}, block);
    const { x, y } = await byRow({ rotation: turned(90 * quarters) }, block);
    // The axes turn counter-clockwise, so the places turn clockwise in them.
    const expected = [
      [plain.x, plain.y],
      [plain.y, negated(plain.x)],
      [negated(plain.x), negated(plain.y)],
      [negated(plain.y), plain.x],
    ][quarters]!;
    expect(x).toEqual(expected[0]);
    expect(y).toEqual(expected[1]);
  });

  it('scales by powers of two to the bit, at any angle, rows in the same order', async () => {
    const plain = await byRow({ rotation: turned(17) }, block);
    const larger = await byRow({ rotation: turned(17), scale: { ...BASE.scale, value: 0.05 * 2 ** 20 } }, block);
    expect(larger.x).toEqual(plain.x.map((value) => value * 2 ** 20));
    expect(larger.y).toEqual(plain.y.map((value) => value * 2 ** 20));
    expect(larger.after.row).toEqual(plain.after.row);
  });

  it('keeps distances at any angle', async () => {
    const { x, y } = await byRow({ rotation: turned(33.3), yAxis: 'down' }, block);
    for (let i = 1; i < x.length; i++) {
      const before = 0.05 * Math.hypot(block.x[i]! - block.x[0]!, block.y[i]! - block.y[0]!);
      expect(Math.hypot(x[i]! - x[0]!, y[i]! - y[0]!)).toBeCloseTo(before, 12);
    }
  });

  it('turns a rotation keeps counter-clockwise triangles so, and a flipped y reverses them', async () => {
    const area = (x: Float64Array, y: Float64Array) =>
      (x[1]! - x[0]!) * (y[2]! - y[0]!) - (y[1]! - y[0]!) * (x[2]! - x[0]!);
    const before = area(block.x, block.y);
    const same = await byRow({ rotation: turned(140) }, block);
    expect(area(same.x, same.y) * before).toBeGreaterThan(0);
    const flipped = await byRow({ rotation: turned(140), yAxis: 'down' }, block);
    expect(area(flipped.x, flipped.y) * before).toBeLessThan(0);
  });

  it('gives the same bits whatever the order of rows, with rows left out', async () => {
    const whole = randomBlock(3, [300, 1, 500], 42);
    const parts = {
      geometry: scaleGeometry({ ...BASE, rotation: turned(12), region: { x: [-20, 15], y: null, z: null } }),
      body: [{ kind: 'circle', centre: [3, 2], diameter: 8 }] as const,
    };
    const expected = await calibrated(settingsWith(parts), whole);
    expect(expected.tally.insideBody).toBeGreaterThan(0);
    expect(expected.tally.outsideRegion).toBeGreaterThan(0);
    for (let seed = 1; seed <= 3; seed++) {
      const { block: after, tally } = await calibrated(settingsWith(parts), shuffled(copyBlock(whole), seed));
      expect(tally).toEqual(expected.tally);
      // `row` moves with the rows: it names them, so sorted blocks agree in it as well here.
      expect(after).toEqual(expected.block);
    }
  });
});
