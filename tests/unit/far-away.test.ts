import { dropFarAway, fieldLimits, newFarAwayTally } from '@wakeloom/tracker/detections/far-away';
import { expect, it } from 'vitest';
import { uniformPoints } from '../helpers/points';

function block(x: number[], y: number[]) {
  return {
    dims: 2 as const,
    number: Int32Array.of(0, 1),
    time: Float64Array.of(0, 1),
    segment: new Int32Array(2),
    offsets: Uint32Array.of(0, x.length >> 1, x.length),
    x: Float64Array.from(x),
    y: Float64Array.from(y),
    z: new Float64Array(0),
    brightness: Float32Array.from(x, (_, i) => i),
    row: Float64Array.from(x, (_, i) => i),
    given: new Int32Array(0),
  };
}

it('leaves out slips of a digit, in all columns, and keeps what lies a few fields away', () => {
  const { x, y } = uniformPoints(1000, 2, 3, 100);
  const limits = fieldLimits([block([...x], [...y])]);
  const places = [
    [50, 50],
    [1e17, 50],
    [350, 50],
    [50, -1e9],
    [20, 20],
    [99, 1],
  ];
  const tally = newFarAwayTally();
  const kept = dropFarAway(
    block(
      places.map((p) => p[0]),
      places.map((p) => p[1]),
    ),
    limits,
    tally,
  );
  expect([...kept.row]).toEqual([0, 2, 4, 5]);
  expect([...kept.brightness]).toEqual([0, 2, 4, 5]);
  expect([...kept.offsets]).toEqual([0, 2, 4]);
  expect(tally.farAway).toBe(2);
  expect(tally.examples[0]).toEqual({ row: 1, x: 1e17, y: 50 });
});

it('sets no limit along an axis on which half of the field is one place', () => {
  const limits = fieldLimits([block([1, 2, 3, 4], [7, 7, 7, 7])]);
  expect(limits.max[1]).toBe(Number.POSITIVE_INFINITY);
  expect(limits.max[0]).toBeLessThan(100);
});
