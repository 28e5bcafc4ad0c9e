import { gridShape, withoutNoise } from '@wakeloom/tracker/eulerian/grid-shape';
import { describe, expect, it } from 'vitest';

const settings = (bin: readonly [number, number, number] | 'auto', overlap = 0) => ({
  bin,
  overlap,
  fewestForMean: 5,
  fewestForStress: 50,
});
const box = { min: [-3.2, 0.1, -1], max: [5.9, 4.05, 1] } as const;

describe('grid shape', () => {
  it('bin borders on the origin, bins cover the samples', () => {
    const shape = gridShape(settings([1, 0.5, 1]), 2, box, 0.3);
    expect(shape.count).toEqual([10, 9, 1]);
    expect(shape.first).toEqual([-3.5, 0.25, 0]);
    expect(shape.step.slice(0, 2)).toEqual([1, 0.5]);
  });

  it('overlap: centres closer, size kept', () => {
    const shape = gridShape(settings([1, 1, 1], 0.5), 2, box, 0.3);
    expect(shape.step[0]).toBe(0.5);
    expect(shape.size[0]).toBe(1);
    expect(shape.first[0]).toBe(-3.25);
    expect(shape.count[0]).toBe(19);
  });

  it('volume: bins along z too', () => {
    const shape = gridShape(settings([1, 1, 0.5]), 3, box, 0.3);
    expect(shape.count).toEqual([10, 5, 5]);
  });

  it('automatic: about 200 samples a bin, plain numbers, bounded by spacing and field', () => {
    // 50 frames at spacing 0.2: side 0.2 sqrt(200 / 50) = 0.4.
    expect(gridShape(settings('auto'), 2, box, 0.2, 50).size.slice(0, 2)).toEqual([0.4, 0.4]);
    // In a volume the cube root: 0.2 (200 / 25)^(1/3) = 0.4.
    expect(gridShape(settings('auto'), 3, box, 0.2, 25).size).toEqual([0.4, 0.4, 0.4]);
    // A long run: not below half a spacing.
    expect(gridShape(settings('auto'), 2, box, 0.2, 1e6).size[0]).toBe(0.1);
    // A thin one: not above a twelfth of 9.1 = 0.758, rounded up to 0.8.
    expect(gridShape(settings('auto'), 2, box, 0.2, 1).size[0]).toBe(0.8);
  });

  it('coded errors say what to do', () => {
    const code = (call: () => unknown) => {
      try {
        call();
      } catch (error) {
        return (error as { code: string }).code;
      }
      return 'none';
    };
    expect(code(() => gridShape(settings([1e-4, 1e-4, 1]), 2, box, 0.3))).toBe('grid/too-many-bins');
    expect(code(() => gridShape(settings([0, 1, 1]), 2, box, 0.3))).toBe('grid/bin-size');
    const empty = { min: [Infinity, Infinity, 0], max: [-Infinity, -Infinity, 0] } as const;
    expect(code(() => gridShape(settings('auto'), 2, empty, 0.3))).toBe('grid/no-extent');
  });

  it('a field that noise makes a little larger gets no rim of bins', () => {
    const noisy = { min: [-0.012, -0.004, -1], max: [64.011, 48.009, 1] } as const;
    const { bounds, tolerance } = withoutNoise(noisy, [0.005, 0.005, Number.NaN]);
    const shape = gridShape(settings([4, 4, 1]), 2, bounds, 1);
    expect(shape.count).toEqual([16, 12, 1]);
    expect(shape.first).toEqual([2, 2, 0]);
    // Whatever lies in the noisy field still counts.
    for (const axis of [0, 1]) {
      expect(shape.first[axis]! - shape.size[axis]! / 2 - tolerance[axis]!).toBeLessThanOrEqual(noisy.min[axis]!);
      const end = shape.first[axis]! + (shape.count[axis]! - 0.5) * shape.step[axis]!;
      expect(end + tolerance[axis]!).toBeGreaterThan(noisy.max[axis]!);
    }
    // A field no wider than its noise stays as it is.
    const thin = { min: [0, 0, 0], max: [0.01, 0.01, 0.01] } as const;
    expect(withoutNoise(thin, [0.005, 0.005, 0.005])).toEqual({ bounds: thin, tolerance: [0, 0, 0] });
  });

  it('a field without extent gets one bin', () => {
    const point = { min: [2, 2, 0], max: [2, 2, 0] } as const;
    expect(gridShape(settings('auto'), 2, point, Number.NaN).count).toEqual([1, 1, 1]);
  });
});
