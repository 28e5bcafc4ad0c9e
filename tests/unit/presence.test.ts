import { Presence } from '@wakeloom/tracker/linking/presence';
import { describe, expect, it } from 'vitest';

/** A frame in which `linked` of `all` pathlines of a kind got a detection. */
function frame(presence: Presence, age: number, missed: number, linked: number, all: number): void {
  for (let n = 0; n < all; n++) presence.count(age, missed, n < linked);
  presence.fade();
}

/** Age in detections, and frames missed. */
type Kind = readonly [number, number];
const SINGLE: Kind = [1, 0];
const SEEN: Kind = [2, 0];
const MISSED: Kind = [7, 1];
/** What is assumed before any was seen, with the weight of ten cases. */
const ASSUMED: [string, Kind, number][] = [
  ['single detections', SINGLE, 0.6],
  ['pathlines seen in the last frame', SEEN, 0.9],
  ['pathlines that missed frames', MISSED, 0.5],
];

describe.each(ASSUMED)('presence of %s', (_name, kind, assumed) => {
  it('is assumed before any was seen, and stays so without any', () => {
    const presence = new Presence();
    expect(presence.of(...kind)).toBe(assumed);
    for (let k = 0; k < 5; k++) presence.fade();
    expect(presence.of(...kind)).toBeCloseTo(assumed, 14);
  });

  it('is the share that was linked with ten imagined cases, once the frame is closed', () => {
    const presence = new Presence();
    for (let n = 0; n < 40; n++) presence.count(...kind, n < 30);
    expect(presence.of(...kind)).toBe(assumed);
    presence.fade();
    // Of what is counted 0.95 stays.
    expect(presence.of(...kind)).toBeCloseTo((0.95 * 30 + 10 * assumed) / (0.95 * 40 + 10), 14);
    frame(presence, ...kind, 5, 20);
    const linked = 0.95 * (0.95 * 30 + 5);
    const all = 0.95 * (0.95 * 40 + 20);
    expect(presence.of(...kind)).toBeCloseTo((linked + 10 * assumed) / (all + 10), 14);
  });

  it('tends to the share of a field that stays as it is', () => {
    const presence = new Presence();
    for (let k = 0; k < 800; k++) frame(presence, ...kind, 30, 40);
    // 0.95 + 0.95^2 + ... = 19.
    expect(presence.of(...kind)).toBeCloseTo((19 * 30 + 10 * assumed) / (19 * 40 + 10), 12);
  });

  it('is never none and never sure', () => {
    for (const [linked, bound] of [
      [0, 0.02],
      [5000, 0.995],
    ]) {
      const presence = new Presence();
      frame(presence, ...kind, linked, 5000);
      expect(presence.of(...kind)).toBe(bound);
    }
  });

  it('does not depend on the other kinds', () => {
    const presence = new Presence();
    for (const [, other] of ASSUMED) if (other !== kind) for (let n = 0; n < 300; n++) presence.count(...other, false);
    presence.fade();
    expect(presence.of(...kind)).toBeCloseTo(assumed, 14);
    for (const [, other, before] of ASSUMED) if (other !== kind) expect(presence.of(...other)).toBeLessThan(before / 5);
  });
});

describe('kinds of presence', () => {
  it('are single, seen in the last frame, and missed whatever the age', () => {
    const presence = new Presence();
    expect([presence.of(2, 0), presence.of(200, 0)]).toEqual([0.9, 0.9]);
    expect([presence.of(1, 1), presence.of(2, 1), presence.of(200, 2)]).toEqual([0.5, 0.5, 0.5]);
  });
});

describe('data of presence', () => {
  it('go on as the same record, and are copies', () => {
    const presence = new Presence();
    frame(presence, ...SINGLE, 3, 50);
    frame(presence, ...SEEN, 90, 100);
    for (let n = 0; n < 8; n++) presence.count(...MISSED, true);
    const data = presence.toData();
    const other = new Presence();
    frame(other, ...SINGLE, 77, 78);
    other.restore(data);
    const both = [presence, other];
    const seen = () => both.map((one) => ASSUMED.map(([, kind]) => one.of(...kind)));
    const [first, second] = seen();
    expect(second).toEqual(first);
    for (const one of both) frame(one, ...MISSED, 1, 9);
    const [third, fourth] = seen();
    expect(fourth).toEqual(third);
    expect(third).not.toEqual(first);
    const again = new Presence();
    again.restore(data);
    expect(ASSUMED.map(([, kind]) => again.of(...kind))).toEqual(first);
  });
});
