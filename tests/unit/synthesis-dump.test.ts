import type { ByteSink } from '@wakeloom/tracker';
import { dumpToCsv } from '@wakeloom/tracker/synthesis/dump-to-csv';
import { potentialCylinder } from '@wakeloom/tracker/synthesis/flows-bodies';
import { uniformFlow } from '@wakeloom/tracker/synthesis/flows-elementary';
import { burgersVortex } from '@wakeloom/tracker/synthesis/flows-vortices';
import { type SynthesisOptions, synthesise } from '@wakeloom/tracker/synthesis/make-dump';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { describe, expect, it } from 'vitest';
import { carry } from '../helpers/true-motion.js';

const cylinder: SynthesisOptions = {
  flow: potentialCylinder(30, 2.5),
  frames: 60,
  rate: 60,
  perFrame: 1500,
  region: { x: [-12, 20], y: [-12, 12] },
  scale: 0.05,
  lossShare: 0,
  ghostShare: 0,
  noisePx: 0,
  seed: 11,
  stay: 1,
};

function memorySink(): { sink: ByteSink; text: () => string } {
  const parts: Uint8Array[] = [];
  return {
    sink: { write: async (bytes) => void parts.push(bytes.slice()), close: async () => {} },
    text: () => new TextDecoder().decode(Buffer.concat(parts)),
  };
}

describe('random streams', () => {
  it('gives normal, exponential and Poisson numbers with their means and variances', () => {
    const random = randomStream(5, 'test');
    const moments = (draw: () => number) => {
      const n = 40000;
      let mean = 0;
      let square = 0;
      for (let k = 0; k < n; k++) {
        const value = draw();
        mean += value / n;
        square += (value * value) / n;
      }
      return [mean, square - mean * mean];
    };
    // Five standard errors of a mean over 40000 draws: 5 sqrt(variance / 40000); of a variance about 5 sqrt(2..8 / 40000).
    const [normalMean, normalVariance] = moments(() => random.normal());
    expect(Math.abs(normalMean)).toBeLessThan(0.025);
    expect(Math.abs(normalVariance - 1)).toBeLessThan(0.036);
    const [waitMean, waitVariance] = moments(() => random.exponential());
    expect(Math.abs(waitMean - 1)).toBeLessThan(0.025);
    expect(Math.abs(waitVariance - 1)).toBeLessThan(0.071);
    for (const mean of [3, 100]) {
      const [countMean, countVariance] = moments(() => random.poisson(mean));
      expect(Math.abs(countMean - mean)).toBeLessThan(0.025 * Math.sqrt(mean));
      expect(Math.abs(countVariance / mean - 1)).toBeLessThan(0.045);
    }
  });

  it('gives each label a stream of its own, the same every time', () => {
    expect(randomStream(1, 'a').uniform()).toBe(randomStream(1, 'a').uniform());
    expect(randomStream(1, 'a').uniform()).not.toBe(randomStream(1, 'b').uniform());
    expect(randomStream(1, 'a').uniform()).not.toBe(randomStream(2, 'a').uniform());
  });
});

describe('synthetic dump', () => {
  it('keeps the density even and stationary, with particles coming in and turning over', () => {
    const frames = [...synthesise(cylinder)];
    for (const part of [frames.slice(0, 30), frames.slice(30)]) {
      const mean = part.reduce((sum, frame) => sum + frame.x.length, 0) / part.length;
      // One population is Poisson-like (sd 39); half a run sees less than one whole exchange, so allow 4 sd.
      expect(Math.abs(mean - cylinder.perFrame)).toBeLessThan(4 * Math.sqrt(cylinder.perFrame));
    }
    // Last frame, quarters of the view along x, each clear of the solid share but the second: counts against area.
    const last = frames[59];
    const width = 640;
    const free = (from: number, to: number) => {
      let inside = 0;
      const n = 400;
      for (let i = 0; i < n; i++)
        for (let j = 0; j < n; j++) {
          const x = -12 + (from + ((to - from) * (i + 0.5)) / n) * 0.05;
          const y = -12 + (24 * (j + 0.5)) / n;
          if (x * x + y * y >= 6.25) inside++;
        }
      return (inside / (n * n)) * (to - from);
    };
    const whole = free(0, width);
    for (let q = 0; q < 4; q++) {
      const from = (width * q) / 4;
      const to = (width * (q + 1)) / 4;
      const expected = (last.x.length * free(from, to)) / whole;
      const found = last.x.filter((x) => x >= from && x < to).length;
      expect(Math.abs(found - expected)).toBeLessThan(4 * Math.sqrt(expected));
    }
  });

  it('leaves no particle inside the body and writes y down', () => {
    for (const frame of synthesise(cylinder)) {
      for (let row = 0; row < frame.x.length; row++) {
        const x = -12 + frame.x[row] * 0.05;
        const y = 12 - frame.y[row] * 0.05;
        expect(x * x + y * y).toBeGreaterThanOrEqual(6.25 - 1e-9);
      }
    }
    const up = [...synthesise({ ...cylinder, flow: uniformFlow(0, 6), frames: 2, stay: undefined })];
    const rowOf = new Map([...up[1].particle].map((id, row) => [id, row]));
    let joined = 0;
    for (let row = 0; row < up[0].x.length; row++) {
      const next = rowOf.get(up[0].particle[row]);
      if (next === undefined) continue;
      joined++;
      // 6 mm/s upwards at 60 Hz and 0.05 mm/px: two px less a frame.
      expect(up[1].y[next] - up[0].y[row]).toBeCloseTo(-2, 9);
    }
    expect(joined).toBeGreaterThan(1300);
  });

  it('moves particles as an independent, finer integrator does, with an error of the fourth order', () => {
    const worst = (substeps: number) => {
      const frames = [...synthesise({ ...cylinder, frames: 12, substeps })];
      const first = new Map([...frames[0].particle].map((id, row) => [id, row]));
      let compared = 0;
      let largest = 0;
      for (let row = 0; row < frames[11].x.length; row++) {
        const from = first.get(frames[11].particle[row]);
        if (from === undefined) continue;
        const start = [-12 + frames[0].x[from] * 0.05, 12 - frames[0].y[from] * 0.05];
        const [x, y] = carry(cylinder.flow, start, 0, 11 / 60, 220);
        const miss = Math.hypot((x + 12) / 0.05 - frames[11].x[row], (12 - y) / 0.05 - frames[11].y[row]);
        largest = Math.max(largest, miss);
        compared++;
      }
      expect(compared).toBeGreaterThan(800);
      return largest;
    };
    const coarse = worst(4);
    const fine = worst(8);
    // A tenth of the usual position noise of 0.1 px is what truth may be off by; halving the step divides by 16.
    expect(coarse).toBeLessThan(0.01);
    expect(coarse / fine).toBeGreaterThan(10);
    expect(coarse / fine).toBeLessThan(24);
  });

  it('loses, adds and shifts as asked', () => {
    const clean = [...synthesise({ ...cylinder, frames: 40 })];
    const spoilt = [...synthesise({ ...cylinder, frames: 40, lossShare: 0.1, ghostShare: 0.05, noisePx: [0.2, 0.4] })];
    let particles = 0;
    let kept = 0;
    let ghosts = 0;
    const squares = [0, 0];
    for (let k = 0; k < 40; k++) {
      const place = new Map([...clean[k].particle].map((id, row) => [id, row]));
      particles += clean[k].x.length;
      for (let row = 0; row < spoilt[k].x.length; row++) {
        const id = spoilt[k].particle[row];
        if (id < 0) {
          ghosts++;
          continue;
        }
        const truth = place.get(id) as number;
        kept++;
        squares[0] += (spoilt[k].x[row] - clean[k].x[truth]) ** 2;
        squares[1] += (spoilt[k].y[row] - clean[k].y[truth]) ** 2;
      }
    }
    // About 60000 draws: 5 standard errors of the share 0.1 are 0.0061, of a relative variance 5 sqrt(2/54000) = 0.031.
    expect(Math.abs(1 - kept / particles - 0.1)).toBeLessThan(0.0065);
    expect(Math.abs(squares[0] / kept / 0.04 - 1)).toBeLessThan(0.031);
    expect(Math.abs(squares[1] / kept / 0.16 - 1)).toBeLessThan(0.031);
    // 3000 ghosts expected, Poisson: 5 sd are 274.
    expect(Math.abs(ghosts - 40 * 0.05 * 1500)).toBeLessThan(274);
  });

  it('gives the same bytes for the same seed, others for another, and no truth', async () => {
    const write = async (seed: number) => {
      const { sink, text } = memorySink();
      const counts = await dumpToCsv(synthesise({ ...cylinder, frames: 5, seed, ghostShare: 0.02 }), sink);
      return { text: text(), counts };
    };
    const first = await write(3);
    expect((await write(3)).text).toBe(first.text);
    expect((await write(4)).text).not.toBe(first.text);
    const lines = first.text.split('\n');
    expect(lines[0]).toBe('frame,x,y,intensity');
    expect(lines.length).toBe(first.counts.rows + 2);
    expect(new TextEncoder().encode(first.text).length).toBe(first.counts.bytes);
  });

  it('fills a volume and writes z', async () => {
    const options: SynthesisOptions = {
      ...cylinder,
      flow: burgersVortex(200, 0.5, 1, 10),
      region: { x: [-10, 10], y: [-10, 10], z: [0, 5] },
      frames: 20,
      stay: undefined,
    };
    const frames = [...synthesise(options)];
    const mean = frames.slice(10).reduce((sum, frame) => sum + frame.z.length, 0) / 10;
    expect(Math.abs(mean - options.perFrame)).toBeLessThan(4 * Math.sqrt(options.perFrame));
    const { sink, text } = memorySink();
    await dumpToCsv(frames.slice(0, 1), sink);
    expect(text().slice(0, 23)).toBe('frame,x,y,z,intensity\n0');
  });

  it('refuses senseless options with the name and what was expected', () => {
    for (const wrong of [
      { frames: 0 },
      { lossShare: 1 },
      { scale: Number.NaN },
      { region: { x: [1, 0], y: [0, 1] } },
    ]) {
      const options = { ...cylinder, ...wrong } as SynthesisOptions;
      expect(() => synthesise(options).next()).toThrow(expect.objectContaining({ code: 'usage/synthesis-option' }));
    }
  });
});
