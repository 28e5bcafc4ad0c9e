import { resolveRun } from '@wakeloom/tracker/run/resolve';
import { systematicLines } from '@wakeloom/tracker/run/systematic';
import { describe, expect, it } from 'vitest';

function linesOf(options: Record<string, string>) {
  const lines = systematicLines(resolveRun({ options }).settings);
  return Object.fromEntries(lines.map((line) => [line.source, line]));
}

describe('systematic uncertainties', () => {
  it('gives scale and rate as shares, origin as a length, angle in degrees', () => {
    const lines = linesOf({
      scale: '0.0500 +- 0.0002 mm/px',
      rate: '60 +- 0.03 Hz',
      origin: '812, 640 +- 0.5 px',
      rotation: '1 +- 0.1 deg',
    });
    expect(Object.keys(lines)).toEqual(['geometry.scale', 'geometry.origin', 'geometry.rotation', 'clock.rate']);
    expect(lines['geometry.scale']).toMatchObject({ standardUncertainty: expect.closeTo(0.004, 14), unit: '1' });
    expect(lines['geometry.origin']).toMatchObject({ standardUncertainty: expect.closeTo(0.025, 14), unit: 'mm' });
    expect(lines['geometry.rotation']).toMatchObject({ standardUncertainty: 0.1, unit: 'deg' });
    expect(lines['clock.rate']).toMatchObject({ standardUncertainty: expect.closeTo(0.0005, 15), unit: '1' });
    expect(lines['clock.rate']!.effect).toContain('twice that share of every acceleration');
  });

  it('gives the delay of pairs, and nothing where nothing is known', () => {
    const pairs = linesOf({ 'pair-delay': '400 +- 2 us', 'pair-rate': '15 Hz' });
    expect(pairs['clock.pairs.delay']!.standardUncertainty).toBeCloseTo(0.005, 14);
    expect(Object.keys(pairs)).toEqual(['clock.pairs.delay']);
    expect(linesOf({ scale: '0.05 mm/px', rate: '60 Hz' })).toEqual({});
  });
});
