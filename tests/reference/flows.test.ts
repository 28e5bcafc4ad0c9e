import type { Flow } from '@wakeloom/tracker/synthesis/flow';
import { potentialCylinder, STABLE_STREET_RATIO, vortexStreet } from '@wakeloom/tracker/synthesis/flows-bodies';
import { abcFlow, doubleGyre, taylorGreen } from '@wakeloom/tracker/synthesis/flows-cellular';
import {
  poiseuilleChannel,
  polynomialMotion,
  shearFlow,
  solidRotation,
  stagnationFlow,
  travellingWave,
  uniformFlow,
} from '@wakeloom/tracker/synthesis/flows-elementary';
import { randomFlow } from '@wakeloom/tracker/synthesis/flows-random';
import { burgersVortex, lambOseen, rankineVortex } from '@wakeloom/tracker/synthesis/flows-vortices';
import { rungeKutta } from '@wakeloom/tracker/synthesis/runge-kutta';
import { describe, expect, it } from 'vitest';
import reference from '../../data/reference/flows.json' with { type: 'json' };
import { carry } from '../helpers/true-motion.js';

function at(flow: Flow, x: number, y: number, z = 0, t = 0): number[] {
  const velocity = new Float64Array(3);
  flow.velocity(x, y, z, t, velocity);
  return [...velocity.slice(0, flow.dims)];
}

/** Gradient tensor by fourth-order central differences: rows u, v, w; columns d/dx, d/dy, d/dz. */
function gradient(flow: Flow, place: readonly [number, number, number], t: number, h: number): number[][] {
  const rows = Array.from({ length: flow.dims }, () => new Array<number>(flow.dims).fill(0));
  for (let axis = 0; axis < flow.dims; axis++) {
    const sample = (k: number) => {
      const p = [...place];
      p[axis] += k * h;
      return at(flow, p[0], p[1], p[2], t);
    };
    const [a, b, c, d] = [sample(-2), sample(-1), sample(1), sample(2)];
    for (let row = 0; row < flow.dims; row++) rows[row][axis] = (a[row] - 8 * b[row] + 8 * c[row] - d[row]) / (12 * h);
  }
  return rows;
}

describe('flows against published and independently computed values', () => {
  it('double gyre: velocities and pathlines', () => {
    const flow = doubleGyre();
    for (const row of reference.double_gyre.values) {
      const [u, v] = at(flow, row.x, row.y, 0, row.t);
      // The table has 12 digits.
      expect(Math.abs(u - row.u)).toBeLessThan(1e-11);
      expect(Math.abs(v - row.v)).toBeLessThan(1e-11);
    }
    for (const row of reference.double_gyre.pathlines) {
      const place = Float64Array.of(row.x0, row.y0);
      rungeKutta(flow, row.T, 4000)(place, row.t0);
      const other = carry(flow, [row.x0, row.y0], row.t0, row.t0 + row.T, 2000);
      for (let axis = 0; axis < 2; axis++) {
        expect(Math.abs(place[axis] - row.end[axis])).toBeLessThan(1e-6); // the reference's own advice: 1e-6
        expect(Math.abs(other[axis] - row.end[axis])).toBeLessThan(1e-6);
      }
    }
  });

  it('ABC flow: velocity, curl, pathline', () => {
    const flow = abcFlow();
    const velocity = at(flow, 1, 2, 3);
    reference.abc.u_at_1_2_3.forEach((value, axis) => {
      expect(Math.abs(velocity[axis] - value)).toBeLessThan(1e-11);
    });
    const g = gradient(flow, [1, 2, 3], 0, 1e-3);
    const curl = [g[2][1] - g[1][2], g[0][2] - g[2][0], g[1][0] - g[0][1]];
    curl.forEach((value, axis) => {
      expect(Math.abs(value - velocity[axis])).toBeLessThan(1e-9);
    });
    const place = Float64Array.of(1, 2, 3);
    rungeKutta(flow, 5, 2000)(place, 0);
    const other = carry(flow, [1, 2, 3], 0, 5, 1000);
    reference.abc.pathline_from_1_2_3_T5.forEach((value, axis) => {
      expect(Math.abs(place[axis] - value)).toBeLessThan(1e-7);
      expect(Math.abs(other[axis] - value)).toBeLessThan(1e-7);
    });
  });

  it('potential flow past a cylinder: velocity and material acceleration', () => {
    const flow = potentialCylinder(1, 0.5);
    const { u, v, material_acceleration } = reference.potential_cylinder;
    expect(at(flow, 1, 0.5)[0]).toBeCloseTo(u, 14);
    expect(at(flow, 1, 0.5)[1]).toBeCloseTo(v, 14);
    const g = gradient(flow, [1, 0.5, 0], 0, 1e-3);
    expect(u * g[0][0] + v * g[0][1]).toBeCloseTo(material_acceleration[0], 8);
    expect(u * g[1][0] + v * g[1][1]).toBeCloseTo(material_acceleration[1], 8);
    // Surface speed 2 U sin(theta), and none inside.
    expect(Math.hypot(...at(flow, 0.5 * Math.cos(1) * (1 + 1e-12), 0.5 * Math.sin(1) * (1 + 1e-12)))).toBeCloseTo(
      2 * Math.sin(1),
      10,
    );
    expect(at(flow, 0.1, 0.2)).toEqual([0, 0]);
    expect(flow.inside?.(0.1, 0.2, 0)).toBe(true);
  });

  it('Lamb-Oseen: place and size of the fastest swirl, water at 20 degC after 10 s', () => {
    const table = reference.lamb_oseen;
    const water = table.water_20_degC_after_10_s;
    const viscosity = water.kinematic_viscosity_m2_per_s * 1e6;
    const flow = lambOseen(1000, 0, viscosity);
    const core = Math.sqrt(4 * viscosity * 10);
    expect(core).toBeCloseTo(water.r_c_mm, 4);
    const swirl = (r: number) => at(flow, r, 0, 0, 10)[1];
    const rMax = core * table.sqrt_alpha;
    expect(rMax).toBeCloseTo(water.r_max_mm, 4);
    expect(swirl(rMax)).toBeGreaterThan(swirl(rMax * 1.001));
    expect(swirl(rMax)).toBeGreaterThan(swirl(rMax * 0.999));
    expect(swirl(rMax) / (1000 / (2 * Math.PI * core))).toBeCloseTo(table.umax_coefficient, 12);
    expect((2 * Math.PI * rMax * swirl(rMax)) / 1000).toBeCloseTo(table.circulation_fraction_at_rmax, 11);
  });

  it('Rankine and Burgers vortex: largest swirl, vorticity', () => {
    const rankine = rankineVortex(2 * Math.PI, 2);
    expect(at(rankine, 0, 2)[0]).toBeCloseTo(-0.5, 14); // Gamma / (2 pi a)
    const inner = gradient(rankine, [0.3, 0.4, 0], 0, 1e-2);
    const outer = gradient(rankine, [3, 4, 0], 0, 1e-2);
    expect(inner[1][0] - inner[0][1]).toBeCloseTo(0.5, 10); // Gamma / (pi a^2)
    expect(outer[1][0] - outer[0][1]).toBeCloseTo(0, 10);
    const burgers = burgersVortex(400, 2, 1.0034, 5);
    const rMax = reference.burgers_r_max_over_sqrt_nu_over_gamma * Math.sqrt(1.0034 / 2);
    const swirl = (r: number) => at(burgers, r, 0, 1)[1];
    expect(swirl(rMax)).toBeGreaterThan(swirl(rMax * 1.001));
    expect(swirl(rMax)).toBeGreaterThan(swirl(rMax * 0.999));
    const g = gradient(burgers, [0, 0, 0], 0, 1e-3);
    expect(g[1][0] - g[0][1]).toBeCloseTo((400 * 2) / (4 * Math.PI * 1.0034), 6); // Gamma gamma / (4 pi nu)
    expect(at(burgers, 0, 0, 3)).toEqual([-0, 0, 11]);
  });

  it('Taylor-Green: vorticity at a centre and decay of energy', () => {
    const flow = taylorGreen(2, 3, 0.1);
    const g = gradient(flow, [0, 0, 0], 0.5, 1e-3);
    const decay = Math.exp(-2 * 0.1 * 9 * 0.5);
    expect(g[1][0] - g[0][1]).toBeCloseTo(2 * 2 * 3 * decay, 8);
    const energy = (t: number) => {
      let sum = 0;
      for (let i = 0; i < 32; i++)
        for (let j = 0; j < 32; j++) {
          const [u, v] = at(flow, (2 * Math.PI * i) / 96, (2 * Math.PI * j) / 96, 0, t);
          sum += u * u + v * v;
        }
      return sum;
    };
    expect(energy(0.5) / energy(0)).toBeCloseTo(Math.exp(-4 * 0.1 * 9 * 0.5), 12);
  });

  it('elementary motions follow their closed pathlines', () => {
    const end = (flow: Flow, start: number[], t: number) => {
      const place = Float64Array.from(start);
      rungeKutta(flow, t, 400)(place, 0);
      return place;
    };
    expect(end(stagnationFlow(2), [1, 3], 0.7)[0]).toBeCloseTo(Math.exp(1.4), 8);
    expect(end(stagnationFlow(2), [1, 3], 0.7)[1]).toBeCloseTo(3 * Math.exp(-1.4), 8);
    expect(end(solidRotation(3, 1, 0), [2, 0], 0.5)[1]).toBeCloseTo(Math.sin(1.5), 8);
    expect(end(shearFlow(2, 1), [0, 3], 0.5)[0]).toBeCloseTo(3.5, 12);
    const quadratic = end(polynomialMotion([1, 2], [0, 0, 3]), [5, 5], 2);
    expect(quadratic[0]).toBeCloseTo(5 + 2 + 4, 10); // t + t^2
    expect(quadratic[1]).toBeCloseTo(5 + 8, 10); // t^3
    // Left the origin at t = 0.3: the straight line y = x V0/U0 sin(0.3 omega).
    const place = Float64Array.of(0, 0);
    rungeKutta(travellingWave(4, 1, 5), 1.1, 400)(place, 0.3);
    expect(place[0]).toBeCloseTo(4.4, 10);
    expect(place[1]).toBeCloseTo(4.4 * 0.25 * Math.sin(1.5), 10);
    expect(at(uniformFlow(1, 2, 3), 9, 9, 9)).toEqual([1, 2, 3]);
    const channel = poiseuilleChannel(2, 10);
    expect(at(channel, 0, 5)[0]).toBeCloseTo(3, 14);
    let flux = 0;
    for (let k = 0; k < 1000; k++) flux += at(channel, 0, 0.01 * (k + 0.5))[0] / 1000;
    expect(flux).toBeCloseTo(2, 5);
    expect(channel.inside?.(0, -0.1, 0)).toBe(true);
  });

  it('vortex street: stable ratio, speed of the rows, cores carried with the fluid', () => {
    expect(STABLE_STREET_RATIO).toBeCloseTo(reference.karman_stable_ratio, 7);
    const [spacing, circulation, speed] = [10, 40, 20];
    const gap = STABLE_STREET_RATIO * spacing;
    const rows = speed - (circulation / (2 * spacing)) * Math.tanh((Math.PI * gap) / spacing);
    const nearlyPoint = vortexStreet({ spacing, circulation, speed, coreRadius: 1e-5 });
    expect(at(nearlyPoint, 0, gap / 2)[0]).toBeCloseTo(rows, 6);
    expect(at(nearlyPoint, spacing / 2, -gap / 2)[0]).toBeCloseTo(rows, 6);
    const smooth = vortexStreet({ spacing, circulation, speed, coreRadius: 0.8 });
    const ride = carry(smooth, [spacing / 2, -gap / 2], 0, 1, 200);
    const u = at(smooth, ride[0], ride[1], 0, 1);
    expect(u[0]).toBeCloseTo(ride[0] - spacing / 2, 8);
    expect(ride[1]).toBeCloseTo(-gap / 2, 8);
    // The upper vortex turns clockwise.
    expect(at(smooth, 0, gap / 2 + 0.5)[0]).toBeGreaterThan(at(smooth, 0, gap / 2 - 0.5)[0]);
  });

  it('random flow: mean square as asked, the same from the same seed', () => {
    const shape = { speed: 3, longest: 20, shortest: 4, seed: 9, meanX: 10 };
    const flow = randomFlow(shape);
    let [meanU, squareU, squareV] = [0, 0, 0];
    const n = 200;
    for (let i = 0; i < n; i++)
      for (let j = 0; j < n; j++) {
        const [u, v] = at(flow, i * 3.7, j * 3.7, 0, 0.2);
        meanU += (u - 10) / n / n;
        squareU += (u - 10) ** 2 / n / n;
        squareV += v ** 2 / n / n;
      }
    expect(Math.abs(meanU)).toBeLessThan(0.1);
    // The two together are fixed by the construction, each alone varies with the angles drawn.
    expect(Math.abs((squareU + squareV) / 18 - 1)).toBeLessThan(0.05);
    expect(at(randomFlow(shape), 1, 2, 0, 3)).toEqual(at(flow, 1, 2, 0, 3));
    expect(at(randomFlow({ ...shape, seed: 10 }), 1, 2, 0, 3)).not.toEqual(at(flow, 1, 2, 0, 3));
  });

  it('every one that should has no divergence', () => {
    const flows: Flow[] = [
      shearFlow(2, 1),
      solidRotation(2),
      stagnationFlow(1.5),
      poiseuilleChannel(1, 5),
      travellingWave(3, 1, 2),
      lambOseen(10, 0.5, 0.1, { driftX: 1 }),
      burgersVortex(10, 0.7, 1, 2),
      taylorGreen(1, 1.3, 0.1),
      doubleGyre(),
      abcFlow(),
      potentialCylinder(1, 0.5, 0.7),
      vortexStreet({ spacing: 3, circulation: 2, speed: 1, coreRadius: 0.2 }),
      randomFlow({ speed: 1, longest: 5, shortest: 1, seed: 2 }),
    ];
    for (const flow of flows) {
      const g = gradient(flow, [0.83, 0.71, 0.4], 0.6, 1e-3);
      const size = Math.max(...g.flat().map(Math.abs));
      expect(Math.abs(g.reduce((sum, row, k) => sum + row[k], 0)) / size, flow.name).toBeLessThan(1e-8);
    }
  });
});
