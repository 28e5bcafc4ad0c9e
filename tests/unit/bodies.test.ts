import type { Body } from '@wakeloom/tracker';
import { bodyDistance, insideBodies } from '@wakeloom/tracker/detections/bodies';
import { describe, expect, it } from 'vitest';
import { uniform } from '../helpers/detections.js';

const circle: Body = { kind: 'circle', centre: [1, -2], diameter: 10 };
/** The letter L: not convex, corners at whole numbers, so that distances are known in the head. */
const corner: Body = {
  kind: 'polygon',
  points: [
    [0, 0],
    [4, 0],
    [4, 1],
    [1, 1],
    [1, 4],
    [0, 4],
  ],
};

describe('distance to a body', () => {
  it('is the distance to the rim of a circle', () => {
    expect(bodyDistance(circle, 1, -2)).toBe(-5);
    expect(bodyDistance(circle, 4, 2)).toBe(0);
    expect(bodyDistance(circle, 13, 3)).toBe(8);
  });

  it('is the distance to the nearest edge or corner of a polygon, negative inside', () => {
    expect(bodyDistance(corner, 2, 0.25)).toBe(-0.25);
    expect(bodyDistance(corner, 0.5, 3)).toBe(-0.5);
    expect(bodyDistance(corner, 2, 2)).toBe(1);
    expect(bodyDistance(corner, 7, 5)).toBe(5);
    expect(bodyDistance(corner, -3, -4)).toBe(5);
    expect(bodyDistance(corner, 4, 0.5)).toBe(0);
    // In the notch, level with corners and edges: a ray through corners must not count twice.
    expect(bodyDistance(corner, 3, 1)).toBe(0);
    expect(bodyDistance(corner, -1, 1)).toBe(1);
    expect(bodyDistance(corner, -1, 4)).toBe(1);
  });

  it('does not depend on the sense or the start of the corners', () => {
    const points = corner.kind === 'polygon' ? corner.points : [];
    const other: Body = { kind: 'polygon', points: [...points.slice(2), ...points.slice(0, 2)].reverse() };
    const random = uniform(3);
    for (let i = 0; i < 500; i++) {
      const x = random() * 8 - 2;
      const y = random() * 8 - 2;
      expect(bodyDistance(other, x, y)).toBeCloseTo(bodyDistance(corner, x, y), 14);
    }
  });

  it('agrees with a circle for a polygon of many corners', () => {
    const corners = 720;
    const points = Array.from({ length: corners }, (_, k): [number, number] => {
      const angle = (2 * Math.PI * k) / corners;
      return [1 + 5 * Math.cos(angle), -2 + 5 * Math.sin(angle)];
    });
    // The chord lies inside the circle by r (1 - cos(pi / n)) at most.
    const sag = 5 * (1 - Math.cos(Math.PI / corners));
    const random = uniform(4);
    for (let i = 0; i < 300; i++) {
      const x = random() * 16 - 7;
      const y = random() * 16 - 10;
      const difference = bodyDistance({ kind: 'polygon', points }, x, y) - bodyDistance(circle, x, y);
      expect(difference).toBeGreaterThan(-1e-12);
      expect(difference).toBeLessThan(sag + 1e-12);
    }
  });
});

describe('inside test', () => {
  it('agrees with the sign of the distance to the nearest body', () => {
    const inside = insideBodies([circle, corner])!;
    const random = uniform(5);
    let count = 0;
    for (let i = 0; i < 4000; i++) {
      const x = random() * 16 - 6;
      const y = random() * 16 - 8;
      const expected = bodyDistance(circle, x, y) < 0 || bodyDistance(corner, x, y) < 0;
      expect(inside(x, y)).toBe(expected);
      if (expected) count++;
    }
    expect(count).toBeGreaterThan(500);
  });

  it('counts the surface as outside', () => {
    const inside = insideBodies([circle, corner])!;
    expect(inside(4, 2)).toBe(false);
    expect(inside(2, 3)).toBe(false);
    expect(inside(1, -7)).toBe(false);
  });

  it('is null without a body', () => {
    expect(insideBodies([])).toBeNull();
  });

  it.each<[string, Body]>([
    ['a circle without a diameter', { kind: 'circle', centre: [0, 0], diameter: 0 }],
    ['a circle nowhere', { kind: 'circle', centre: [Number.NaN, 0], diameter: 1 }],
    ['no corners', { kind: 'polygon', points: [] }],
    [
      'a line of corners',
      {
        kind: 'polygon',
        points: [
          [0, 0],
          [1, 1],
          [2, 2],
        ],
      },
    ],
    [
      'a corner at infinity',
      {
        kind: 'polygon',
        points: [
          [0, 0],
          [1, 0],
          [0, Number.POSITIVE_INFINITY],
        ],
      },
    ],
  ])('refuses %s', (_, body) => {
    expect(() => insideBodies([circle, body])).toThrow(
      expect.objectContaining({ code: 'geometry/body', message: expect.stringContaining('body 2') }),
    );
  });
});
