import { readFileSync } from 'node:fs';
import { gunzipSync } from 'node:zlib';
import type { ByteSink } from '@wakeloom/tracker';
import { resolveRun } from '@wakeloom/tracker/run/resolve';
import { parseRunSheet } from '@wakeloom/tracker/run/run-sheet';
import { DEMO_NAMES, type DemoName, demoSynthesis, writeDemo } from '@wakeloom/tracker/synthesis/demo';
import { type SynthesisOptions, synthesise } from '@wakeloom/tracker/synthesis/make-dump';
import { describe, expect, it } from 'vitest';
import { carry } from '../helpers/true-motion.js';

const wake = new Uint8Array(readFileSync(new URL('../../data/wake-re150.bin.gz', import.meta.url)));

async function written(name: DemoName, seed = 1) {
  const files = new Map<string, Uint8Array[]>();
  const makeSink = (file: string): ByteSink => {
    const parts: Uint8Array[] = [];
    files.set(file, parts);
    return { write: async (bytes) => void parts.push(bytes.slice()), close: async () => {} };
  };
  const summary = await writeDemo(name, makeSink, { wake, seed, frames: 12 });
  const bytes = (file: string) => Buffer.concat(files.get(file) ?? []);
  const dump = bytes(summary.dump);
  return {
    summary,
    dump: summary.dump.endsWith('.gz') ? gunzipSync(dump).toString() : dump.toString(),
    raw: dump,
    sheet: bytes(summary.sheet).toString(),
    names: [...files.keys()],
  };
}

/** Largest distance in px between the generator's particles and the fine integrator's after some frames, by share of particles. */
function misses(options: SynthesisOptions, frames: number): number[] {
  const list = [...synthesise({ ...options, frames, lossShare: 0, ghostShare: 0, noisePx: 0 })];
  const { region, scale, rate, flow } = options;
  const place = (k: number, row: number) => {
    const frame = list[k];
    const plane = [region.x[0] + frame.x[row] * scale, region.y[1] - frame.y[row] * scale];
    return flow.dims === 3 ? [...plane, (region.z?.[0] ?? 0) + frame.z[row] * scale] : plane;
  };
  const first = new Map([...list[0].particle].map((id, row) => [id, row]));
  const out: number[] = [];
  for (let row = 0; row < list[frames - 1].x.length; row += 7) {
    const from = first.get(list[frames - 1].particle[row]);
    if (from === undefined) continue;
    const end = carry(flow, place(0, from), 0, (frames - 1) / rate, 40 * (frames - 1));
    const seen = place(frames - 1, row);
    out.push(Math.hypot(...end.map((value, axis) => value - seen[axis])) / scale);
  }
  return out.sort((a, b) => a - b);
}

describe('demos', () => {
  it.each([...DEMO_NAMES])('%s: the same bytes from the same seed, a run sheet that holds', async (name) => {
    const first = await written(name);
    const again = await written(name);
    const other = await written(name, 2);
    expect(again.raw.equals(first.raw)).toBe(true);
    expect(other.dump).not.toBe(first.dump);
    expect(first.names).toEqual([first.summary.dump, `${name}.yaml`]);
    const lines = first.dump.trimEnd().split('\n');
    expect(lines[0]).toBe(name === 'swirl' ? 'frame,x,y,z,intensity' : 'frame,x,y,intensity');
    expect(lines.length - 1).toBe(first.summary.rows);
    // 12 frames of 2000 particles, 5 % lost, 5 % false ones more: 24000 rows, with some 300 as standard deviation
    // (the same population is counted 12 times).
    expect(Math.abs(first.summary.rows - 24000)).toBeLessThan(5 * 12 * Math.sqrt(2000));

    const { settings } = resolveRun({ sheet: parseRunSheet(first.sheet, `${name}.yaml`), options: {} });
    const options = await demoSynthesis(name, { wake });
    expect(settings.dump.files).toEqual([first.summary.dump]);
    expect(settings.clock).toMatchObject({ kind: 'rate', rate: { value: options.rate } });
    const geometry = settings.geometry;
    if (geometry.kind !== 'scale') throw new Error('the demo is scaled, not mapped');
    expect(geometry.scale.value).toBe(options.scale);
    expect(geometry.yAxis).toBe('down');
    expect(geometry.origin[0]).toBeCloseTo(-options.region.x[0] / options.scale, 9);
    expect(geometry.origin[1]).toBeCloseTo(options.region.y[1] / options.scale, 9);
    if (name === 'cylinder-wake') {
      expect(settings.body).toEqual([{ kind: 'circle', centre: [0, 0], diameter: 5 }]);
      expect(settings.fluid?.kinematicViscosity).toBeCloseTo(1.0034e-6, 9);
    } else {
      expect(geometry.origin[2]).toBeCloseTo(-(options.region.z?.[0] ?? 0) / options.scale, 9);
    }
  });

  it('moves about 0.4 of the spacing a frame behind the cylinder', async () => {
    const { summary } = await written('cylinder-wake');
    expect(summary.displacementRatio).toBeGreaterThan(0.33);
    expect(summary.displacementRatio).toBeLessThan(0.45);
  });

  it.each([...DEMO_NAMES])('%s: particles move as an independent, finer integrator moves them', async (name) => {
    const sorted = misses(await demoSynthesis(name, { wake }), 11);
    expect(sorted.length).toBeGreaterThan(100);
    // A tenth of the position noise of 0.1 px, over ten frames.
    expect(sorted[sorted.length - 1]).toBeLessThan(0.01);
  });

  it('puts no particle into the cylinder', async () => {
    const options = await demoSynthesis('cylinder-wake', { wake, frames: 60 });
    for (const frame of synthesise({ ...options, noisePx: 0, ghostShare: 0 })) {
      for (let row = 0; row < frame.x.length; row++) {
        expect(Math.hypot(frame.x[row] - 240, frame.y[row] - 512)).toBeGreaterThanOrEqual(50 - 1e-9);
      }
    }
  });

  it('says what is missing without the wake field', async () => {
    await expect(demoSynthesis('cylinder-wake')).rejects.toMatchObject({ code: 'usage/demo-wake' });
    await expect(demoSynthesis('cylinder-wake', { wake: wake.subarray(0, 100) })).rejects.toBeTruthy();
    await expect(demoSynthesis('cylinder-wake', { wake: new Uint8Array(50) })).rejects.toMatchObject({
      code: 'usage/wake-file',
    });
  });
});
