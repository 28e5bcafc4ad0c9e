import { EXCLUDED_FROM_GRID, FLAG } from '@wakeloom/tracker/core/columns';
import { type FitParameters, fitLag } from '@wakeloom/tracker/kinematics/fit-parameters';
import { fitWindow } from '@wakeloom/tracker/kinematics/fit-window';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { describe, expect, it } from 'vitest';
import { type LinkedPoint, linkedBlock, sliceFrames } from '../helpers/linked.js';

const NOISE = 0.005;
const BRIDGE = 2;
/** Circles of this radius. A straight line through two samples 3 frames apart would err by 3 to 8 standard errors. */
const RADIUS = 30;
/** Angle a frame: what the third derivative adds to a quadratic over the span stays below 0.4 standard errors. */
const turn = (span: number) => Math.min(0.02, 0.14 / span);

function parameters(span: number, order: 1 | 2 | 3): FitParameters {
  return {
    noise: [NOISE, NOISE, Number.NaN],
    span,
    order,
    bridge: BRIDGE,
    interval: 1,
    pairs: false,
    riskLimit: 1,
    medianThreshold: Number.POSITIVE_INFINITY,
    medianNeighbours: 8,
    medianEpsilon: null,
    offFitLimit: Number.POSITIVE_INFINITY,
    bodies: [],
    rim: 0,
  };
}

/** Pathlines on circles in which two of five detections are missing, never more than the bridge in a row. */
function gappy(seed: string, pathlines: number, frames: number, angular: number) {
  const phases: number[] = [];
  const random = randomStream(71, seed);
  const points: LinkedPoint[] = [];
  for (let p = 0; p < pathlines; p++) {
    const phase = 6 * random.uniform();
    let missed = 0;
    for (let frame = 0; frame < frames; frame++) {
      missed = missed < BRIDGE && random.uniform() < 0.4 ? missed + 1 : 0;
      if (missed > 0 && frame > 0 && frame < frames - 1) continue;
      const angle = phase + angular * frame;
      points.push({
        frame,
        pathline: p,
        x: RADIUS * Math.cos(angle) + NOISE * random.normal(),
        y: RADIUS * Math.sin(angle) + NOISE * random.normal(),
      });
    }
    phases.push(phase);
  }
  return { block: linkedBlock(points), phases };
}

describe('samples near gaps and ends of pathlines', () => {
  for (const span of [3, 5, 7, 9]) {
    it(`span ${span}: every sample has a velocity and an acceleration whose standard errors hold on a curved flow`, () => {
      const angular = turn(span);
      const { block, phases } = gappy(`span ${span}`, 1500, 40, angular);
      const p = parameters(span, 2);
      const s = fitWindow(block, { from: 0, to: 40 }, p);
      const half = (span - 1) / 2;
      const framesOf = new Map<number, number[]>();
      for (let k = 0; k < 40; k++) {
        for (let r = block.offsets[k]!; r < block.offsets[k + 1]!; r++) {
          const known = framesOf.get(block.pathline[r]!);
          if (known === undefined) framesOf.set(block.pathline[r]!, [k]);
          else known.push(k);
        }
      }
      // Count and squares of error over standard error: at an end, beside a gap of two frames, elsewhere.
      const groups = { end: [0, 0, 0], gap: [0, 0, 0], inside: [0, 0, 0] };
      for (let k = 0; k < s.number.length; k++) {
        for (let r = s.offsets[k]!; r < s.offsets[k + 1]!; r++) {
          const angle = phases[s.pathline[r]!]! + angular * s.number[k]!;
          const u = -RADIUS * angular * Math.sin(angle);
          const ax = -RADIUS * angular * angular * Math.cos(angle);
          expect(Number.isFinite(s.u[r]!) && Number.isFinite(s.ax[r]!)).toBe(true);
          const flags = s.flags[r]!;
          const nearEnd = (flags & FLAG['near-end']) !== 0;
          const atEnd = s.number[k]! < half || s.number[k]! > 39 - half;
          if (atEnd) expect(nearEnd).toBe(true);
          const frames = framesOf.get(s.pathline[r]!)!;
          const at = frames.indexOf(k);
          const beside = !atEnd && (k - frames[at - 1]! === 3 || frames[at + 1]! - k === 3);
          const group = groups[atEnd ? 'end' : beside ? 'gap' : 'inside'];
          group[0]!++;
          group[1]! += ((s.u[r]! - u) / s.uSe[r]!) ** 2;
          group[2]! += ((s.ax[r]! - ax) / s.axSe[r]!) ** 2;
        }
      }
      for (const [name, [count, velocity, acceleration]] of Object.entries(groups)) {
        expect(count, name).toBeGreaterThan(500);
        // 1 for pure noise; what the circle adds is below 0.4^2.
        expect(Math.sqrt(velocity! / count!), name).toBeLessThan(1.12);
        expect(Math.sqrt(velocity! / count!), name).toBeGreaterThan(0.93);
        expect(Math.sqrt(acceleration! / count!), name).toBeLessThan(1.12);
        expect(Math.sqrt(acceleration! / count!), name).toBeGreaterThan(0.93);
      }
    });
  }

  it('every fit with an empty side is near-end or bridged', () => {
    const { block } = gappy('sides', 400, 40, turn(5));
    const s = fitWindow(block, { from: 0, to: 40 }, parameters(5, 2));
    const framesOf = new Map<number, number[]>();
    const rows: { frame: number; pathline: number; flags: number }[] = [];
    for (let k = 0; k < 40; k++) {
      for (let r = s.offsets[k]!; r < s.offsets[k + 1]!; r++) {
        framesOf.set(s.pathline[r]!, [...(framesOf.get(s.pathline[r]!) ?? []), k]);
        rows.push({ frame: k, pathline: s.pathline[r]!, flags: s.flags[r]! });
      }
    }
    let empty = 0;
    for (const { frame, pathline, flags } of rows) {
      const near = framesOf.get(pathline)!.filter((k) => Math.abs(k - frame) <= 2);
      if (near.some((k) => k < frame) && near.some((k) => k > frame)) continue;
      empty++;
      expect(flags & (FLAG['near-end'] | FLAG.bridged)).not.toBe(0);
    }
    expect(empty).toBeGreaterThan(100);
  });

  it('does not depend on cuts although fits reach across gaps', () => {
    for (const [span, order] of [
      [3, 2],
      [5, 3],
    ] as const) {
      const p = parameters(span, order);
      const { block } = gappy(`cuts ${span}`, 60, 60, turn(span));
      const whole = fitWindow(block, { from: 0, to: 60 }, p);
      const lag = fitLag(p);
      for (let k = 0; k < 60; k++) {
        const from = Math.max(0, k - lag);
        const one = fitWindow(
          sliceFrames(block, from, Math.min(60, k + 1 + lag)),
          { from: k - from, to: k - from + 1 },
          p,
        );
        const [a, b] = [whole.offsets[k]!, whole.offsets[k + 1]!];
        expect(one.u).toEqual(whole.u.slice(a, b));
        expect(one.axSe).toEqual(whole.axSe.slice(a, b));
        expect(one.flags).toEqual(whole.flags.slice(a, b));
      }
    }
  });

  it('where screening leaves too few samples for the polynomial, the rest of the pathline is not trusted either', () => {
    const points: LinkedPoint[] = [];
    for (let frame = 0; frame < 5; frame++) {
      for (let p = 0; p < 36; p++) {
        const [x, y] = [p % 6, Math.floor(p / 6)];
        // Pathline 14 goes against all others.
        const speed = p === 14 ? -0.3 : 0.05;
        points.push({ frame, pathline: p, x: x + speed * frame + 0.0001 * ((p * 7 + frame * 13) % 10), y });
      }
    }
    const p = { ...parameters(5, 2), medianThreshold: 2, offFitLimit: 5 };
    const s = fitWindow(linkedBlock(points), { from: 0, to: 5 }, p);
    let own = 0;
    for (let r = 0; r < s.flags.length; r++) {
      if (s.pathline[r] !== 14) continue;
      own++;
      expect(s.flags[r]! & EXCLUDED_FROM_GRID).not.toBe(0);
    }
    expect(own).toBe(5);
  });

  it('a sample without a velocity carries near-end', () => {
    const s = fitWindow(
      linkedBlock([
        { frame: 0, pathline: 0, x: 0, y: 0 },
        { frame: 0, pathline: 1, x: 3, y: 0 },
        { frame: 3, pathline: 1, x: 4, y: 0 },
      ]),
      { from: 0, to: 2 },
      parameters(5, 2),
    );
    expect(Array.from(s.u, Number.isNaN)).toEqual([true, false, false]);
    expect(Array.from(s.flags, (flags) => (flags & FLAG['near-end']) !== 0)).toEqual([true, true, true]);
  });
});
