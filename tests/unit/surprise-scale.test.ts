import { KINDS, SurpriseScale } from '@wakeloom/tracker/linking/surprise-scale';
import { describe, expect, it } from 'vitest';

function frame(scale: SurpriseScale, kind: number, ratios: readonly number[]): void {
  for (const ratio of ratios) scale.count(kind, ratio);
  scale.fade();
}

const scales = (scale: SurpriseScale) => Array.from({ length: KINDS }, (_, kind) => scale.of(kind));

describe('scale of expected squares', () => {
  it('is one before anything was seen, and stays so while nothing is or all is as expected', () => {
    const scale = new SurpriseScale();
    expect(scales(scale)).toEqual(new Array(KINDS).fill(1));
    scale.fade();
    expect(scales(scale)).toEqual(new Array(KINDS).fill(1));
    frame(scale, 3, new Array(500).fill(1));
    expect(scale.of(3)).toBeCloseTo(1, 14);
  });

  it('is the mean ratio with twenty imagined ones of size one, once the frame is closed', () => {
    const scale = new SurpriseScale();
    const ratios = [0.5, 2, 3, 0.1, 4.4];
    for (const ratio of ratios) scale.count(2, ratio);
    expect(scale.of(2)).toBe(1);
    scale.fade();
    // 0.95 of what was counted stays; the five add up to ten.
    expect(scale.of(2)).toBeCloseTo((0.95 * 10 + 20) / (0.95 * 5 + 20), 14);
    frame(scale, 2, [0, 0]);
    expect(scale.of(2)).toBeCloseTo((0.95 * 9.5 + 20) / (0.95 * (4.75 + 2) + 20), 14);
    // The other kinds have seen nothing.
    expect(scales(scale).filter((_, kind) => kind !== 2)).toEqual(new Array(KINDS - 1).fill(1));
  });

  it('tends to the mean ratio of late, whatever was before', () => {
    const scale = new SurpriseScale();
    for (let k = 0; k < 300; k++) frame(scale, 0, new Array(50).fill(0.2));
    for (let k = 0; k < 600; k++) frame(scale, 0, [1.5, 2.5, 3.5, 4.5]);
    // 0.95 + 0.95^2 + ... = 19, four a frame of the mean three.
    expect(scale.of(0)).toBeCloseTo((19 * 12 + 20) / (19 * 4 + 20), 9);
  });

  it('a single wrong link counts for eight expected ones at most', () => {
    const scale = new SurpriseScale();
    frame(scale, 5, [1e9]);
    expect(scale.of(5)).toBeCloseTo((0.95 * 8 + 20) / (0.95 + 20), 14);
    // Eight times of what is expected by now, which the scale says.
    const now = scale.of(5);
    frame(scale, 5, [1e9]);
    expect(scale.of(5)).toBeCloseTo((0.95 * (0.95 * 8 + 8 * now) + 20) / (0.95 * 1.95 + 20), 14);
  });

  it('goes on from its data as the same, and the data are copies', () => {
    const scale = new SurpriseScale();
    for (let kind = 0; kind < KINDS; kind++) frame(scale, kind, [kind, 3, 7]);
    scale.count(4, 6);
    const data = scale.toData();
    const other = new SurpriseScale();
    frame(other, 1, [8, 8, 8]);
    other.restore(data);
    const before = scales(scale);
    expect(scales(other)).toEqual(before);
    for (const one of [scale, other]) frame(one, 4, [0.1, 5]);
    expect(scales(other)).toEqual(scales(scale));
    expect(scale.of(4)).not.toBe(before[4]);
    const again = new SurpriseScale();
    again.restore(data);
    expect(scales(again)).toEqual(before);
  });
});
