import { FLAG } from '@wakeloom/tracker/core/columns';
import { EvenFit } from '@wakeloom/tracker/kinematics/even-fit';
import type { FitParameters } from '@wakeloom/tracker/kinematics/fit-parameters';
import { HeldFrames } from '@wakeloom/tracker/kinematics/held-frames';
import { MARK } from '@wakeloom/tracker/kinematics/marks';
import { PathlineFitter } from '@wakeloom/tracker/kinematics/pathline-fitter';
import { WindowPatterns } from '@wakeloom/tracker/kinematics/window-patterns';
import { fitFlags, linkFlag } from '@wakeloom/tracker/screening/flags';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { describe, expect, it } from 'vitest';
import { type LinkedPoint, linkedBlock } from '../helpers/linked.js';

const FRAMES = 60;

function parameters(change: Partial<FitParameters>): FitParameters {
  return {
    noise: [0.01, 0.02, 0.03],
    span: 7,
    order: 2,
    bridge: 2,
    interval: 0.02,
    pairs: false,
    riskLimit: 0.5,
    medianThreshold: 2,
    medianNeighbours: 8,
    medianEpsilon: null,
    offFitLimit: 5,
    bodies: [],
    rim: 0,
    ...change,
  };
}

/** Pathlines with gaps of every length that may be crossed, short and lone ones, outliers; some frames are missing altogether. */
function points(seed: string, bridge: number, losses: number): LinkedPoint[] {
  const random = randomStream(50, seed);
  const missing = new Set([20, 21, 40]);
  const made: LinkedPoint[] = [];
  for (let pathline = 0; pathline < 120; pathline++) {
    const start = Math.floor((FRAMES - 1) * random.uniform());
    const end = Math.min(FRAMES, start + 1 + Math.floor(50 * random.uniform() ** 2));
    let last = start;
    for (let frame = start; frame < end; frame++) {
      if (missing.has(frame) || random.uniform() < losses) continue;
      // Longer gaps end a pathline.
      if (frame - last > bridge + 1) break;
      last = frame;
      const outlier = random.uniform() < 0.02 ? 1 : 0;
      const noise = () => 0.01 * random.normal();
      made.push({
        frame,
        pathline,
        x: pathline + 0.3 * frame + 0.002 * frame * frame + noise() + outlier,
        y: 5 * random.uniform(),
        z: noise() - frame,
        risk: random.uniform() ** 3,
      });
    }
  }
  return made;
}

describe('first fits where the clock is even', () => {
  const cases: [string, Partial<FitParameters>, number][] = [
    ['span 7', {}, 0.1],
    ['span 7, hardly a gap', {}, 0.01],
    ['span 5, most seen in two frames of three', { span: 5 }, 0.35],
    ['degree 1, span 3', { span: 3, order: 1 }, 0.2],
    ['degree 3, span 3: the window is too small', { span: 3, order: 3, bridge: 1 }, 0.2],
    ['degree 3, span 21', { span: 21, order: 3, bridge: 4 }, 0.2],
    ['span 27, the longest reach that has patterns', { span: 27, bridge: 4 }, 0.1],
  ];
  for (const dims of [2, 3] as const) {
    it.each(cases)(`${dims}-D, %s: every bit as the general fit`, (name, change, losses) => {
      const p = parameters(change);
      expect(WindowPatterns.serve(p)).toBe(true);
      const list = points(`${name} ${dims}`, p.bridge, losses);
      const block = linkedBlock(list, { dims, timeOf: (frame) => frame * 0.02 });
      const held = new HeldFrames(dims, block.number.length);
      for (let k = 0; k < block.number.length; k++) held.append(block, k);
      const even = new EvenFit(p);
      for (let k = 0; k < held.frames; k++) even.fitFrame(held, k);

      const fitter = new PathlineFitter(p, dims === 3, FRAMES);
      const half = (p.span - 1) / 2;
      const { columns } = held;
      const rowsOf = new Map<number, { row: number; k: number }[]>();
      for (let k = 0; k < held.frames; k++) {
        for (let row = held.start[k]!; row < held.start[k]! + held.rows[k]!; row++) {
          const id = columns.pathline[row]!;
          if (!rowsOf.has(id)) rowsOf.set(id, []);
          rowsOf.get(id)!.push({ row, k });
        }
      }
      let compared = 0;
      let suspects = 0;
      const seen = new Set<number>();
      for (const rows of rowsOf.values()) {
        fitter.count = rows.length;
        for (const [i, { row, k }] of rows.entries()) {
          fitter.frame[i] = held.number[k]!;
          fitter.time[i] = held.time[k]!;
          fitter.x[i] = columns.x[row]!;
          fitter.y[i] = columns.y[row]!;
          if (dims === 3) fitter.z[i] = columns.z[row]!;
        }
        fitter.place(0, rows.length);
        fitter.fit(0, rows.length);
        const { frame, low, high } = fitter;
        for (const [i, { row }] of rows.entries()) {
          const lo = low[i]!;
          const hi = high[i]!;
          const next = rows[i + 1];
          const suspect = fitter.residual[i]! > p.offFitLimit;
          const want = [
            fitter.px[i]!,
            fitter.py[i]!,
            Math.fround(fitter.vx[i]!),
            Math.fround(fitter.vy[i]!),
            Math.fround(fitter.ax[i]!),
            Math.fround(fitter.ay[i]!),
            Math.fround(fitter.positionRoot[i]!),
            Math.fround(fitter.velocityRoot[i]!),
            Math.fround(fitter.accelerationRoot[i]!),
            (Number.isFinite(fitter.vx[i]!) ? MARK.hasVelocity : 0) |
              (next !== undefined && frame[i + 1]! - frame[i]! === 1 ? MARK.inNextFrame : 0) |
              (i > 0 && frame[i]! - frame[i - 1]! <= 2 ? MARK.inTwoFramesBefore : 0) |
              (suspect ? MARK.suspect : 0),
            fitFlags(
              fitter.reachFirst[i]!,
              fitter.reachLast[i]!,
              frame[i]!,
              half,
              frame[lo]!,
              frame[hi]!,
              i - lo,
              hi - i,
            ) | linkFlag(columns.linkRisk[row]!, next === undefined ? 0 : columns.linkRisk[next.row]!, p.riskLimit),
          ];
          const { px, py, u, v, ax, ay, positionRoot, velocityRoot, accelerationRoot, marks, flags } = columns;
          const all = [px, py, u, v, ax, ay, positionRoot, velocityRoot, accelerationRoot, marks, flags];
          const got = all.map((column) => column[row]!);
          if (dims === 3) {
            want.push(fitter.pz[i]!, Math.fround(fitter.vz[i]!), Math.fround(fitter.az[i]!));
            got.push(columns.pz[row]!, columns.w[row]!, columns.az[row]!);
          }
          if (want.some((value, c) => !Object.is(value, got[c])))
            expect([name, frame[i], ...got]).toEqual([name, frame[i], ...want]);
          compared++;
          if (suspect) suspects++;
          seen.add(flags[row]!);
        }
      }
      expect(compared).toBe(list.length);
      expect(compared).toBeGreaterThan(400);
      if (p.span > p.order + 1) expect(suspects).toBeGreaterThan(0);
      expect(seen.has(FLAG['near-end'])).toBe(true);
    });
  }

  it('patterns are there for even clocks within reach only', () => {
    expect(WindowPatterns.serve(parameters({ interval: null }))).toBe(false);
    expect(WindowPatterns.serve(parameters({ span: 29 }))).toBe(false);
  });
});
