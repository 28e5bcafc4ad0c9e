import { Lattice } from '@wakeloom/tracker/synthesis/lattice-boltzmann';
import { describe, expect, it } from 'vitest';

/** Largest |velocity - expected| over the fluid cells, relative to `scale`. */
function worst(
  lattice: Lattice,
  scale: number,
  expected: (i: number, j: number) => readonly [number, number] | null,
): number {
  const moments = new Float64Array(3);
  let largest = 0;
  for (let j = 1; j < lattice.height - 1; j++) {
    for (let i = 1; i < lattice.width - 1; i++) {
      const truth = expected(i, j);
      if (truth === null) continue;
      lattice.momentsInto(i, j, moments);
      largest = Math.max(largest, Math.hypot(moments[0] - truth[0], moments[1] - truth[1]) / scale);
    }
  }
  return largest;
}

/**
 * Taylor & Green (1937): the exact solution decays as e^(-2 nu k^2 t). Diffusive scaling: with the cell halved the
 * speed halves and the steps quadruple, so a second-order scheme errs a quarter.
 */
function taylorGreenError(cells: number): number {
  const wave = (2 * Math.PI) / cells;
  const viscosity = 0.02;
  const speed = 1.28 / cells;
  const steps = Math.round((0.2 * cells * cells) / 4);
  const lattice = new Lattice({ width: cells + 2, height: cells + 2, viscosity, border: 'periodic' });
  const at = (i: number, j: number): [number, number] => [
    -speed * Math.cos(wave * i) * Math.sin(wave * j),
    speed * Math.sin(wave * i) * Math.cos(wave * j),
  ];
  lattice.initialise((i, j) => [
    ...at(i, j),
    -0.75 * speed * speed * (Math.cos(2 * wave * i) + Math.cos(2 * wave * j)),
  ]);
  for (let k = 0; k < steps; k++) lattice.step();
  const decay = Math.exp(-2 * viscosity * wave * wave * steps);
  return worst(lattice, speed * decay, (i, j) => {
    const [u, v] = at(i, j);
    return [u * decay, v * decay];
  });
}

/** Bessel function J1 by its power series, enough terms for arguments below 4 (exact to rounding there). */
function besselJ1(x: number): number {
  let term = x / 2;
  let sum = term;
  for (let k = 1; k < 30; k++) {
    term *= (-x * x) / (4 * k * (k + 1));
    sum += term;
  }
  return sum;
}

/** First zero of J1 (Abramowitz & Stegun, table 9.5). */
const J11 = 3.8317059702;

/** Swirl dying in a round tank: u_theta = J1(j r/R) e^(-nu j^2 t / R^2) solves the equations exactly, no slip at R. */
function roundTankError(radius: number): number {
  const centre = radius + 3.3;
  const size = Math.ceil(2 * centre) + 1;
  const viscosity = 0.03;
  const speed = 0.64 / radius;
  const steps = Math.round(radius * radius);
  const wall = (x: number, y: number) => radius - Math.hypot(x - centre, y - centre);
  const lattice = new Lattice({ width: size, height: size, viscosity, wall, border: 'periodic' });
  const swirl = (i: number, j: number): [number, number] => {
    const r = Math.hypot(i - centre, j - centre);
    const turn = r < radius && r > 0 ? (speed * besselJ1((J11 * r) / radius)) / r : 0;
    return [-turn * (j - centre), turn * (i - centre)];
  };
  // Pressure that holds the swirl, dp/dr = u^2/r with p = density / 3, so that no sound starts with it.
  const pressure = new Float64Array(400);
  const stride = radius / 390;
  for (let k = 1; k < pressure.length; k++) {
    const r = (k - 0.5) * stride;
    pressure[k] = pressure[k - 1] + (3 * stride * (speed * besselJ1((J11 * r) / radius)) ** 2) / r;
  }
  lattice.initialise((i, j) => {
    const k = Math.min(Math.round(Math.hypot(i - centre, j - centre) / stride), 390);
    return [...swirl(i, j), pressure[k]];
  });
  for (let k = 0; k < steps; k++) lattice.step();
  const decay = Math.exp((-viscosity * J11 * J11 * steps) / (radius * radius));
  return worst(lattice, speed * decay, (i, j) => {
    if (!(wall(i, j) > 0)) return null;
    const [u, v] = swirl(i, j);
    return [u * decay, v * decay];
  });
}

describe('lattice Boltzmann solver', () => {
  it('lets Taylor-Green cells decay as the exact solution, with second-order error', () => {
    const coarse = taylorGreenError(32);
    const fine = taylorGreenError(64);
    expect(fine).toBeLessThan(0.002);
    expect(coarse / fine).toBeGreaterThan(3.3);
    expect(coarse / fine).toBeLessThan(5);
  });

  it('keeps no slip on a round wall between the cells: swirl in a tank decays as J1, second order', () => {
    const coarse = roundTankError(12.4);
    const fine = roundTankError(24.8);
    expect(fine).toBeLessThan(0.01);
    expect(coarse / fine).toBeGreaterThan(2.8);
  });
});
