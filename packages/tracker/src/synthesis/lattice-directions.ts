/** Steps along x of the nine directions, opposites next to each other after the first: rest, E W, N S, NE SW, NW SE. */
export const CX = [0, 1, -1, 0, 0, 1, -1, -1, 1];
/** Steps along y. */
export const CY = [0, 0, 0, 1, -1, 1, -1, 1, -1];
/** Share of each direction in a fluid at rest. */
const WEIGHT = [4 / 9, 1 / 9, 1 / 9, 1 / 9, 1 / 9, 1 / 36, 1 / 36, 1 / 36, 1 / 36];
/** The direction back. */
export const OPPOSITE = [0, 2, 1, 4, 3, 6, 5, 8, 7];

/** Equilibrium less the rest weights at the given density less 1 and velocity (He & Luo 1997), into `into[0..8]`. */
export function equilibriumInto(density: number, u: number, v: number, into: Float64Array): void {
  const even = density - 1.5 * (u * u + v * v);
  for (let d = 0; d < 9; d++) {
    const along = CX[d] * u + CY[d] * v;
    into[d] = WEIGHT[d] * (even + 3 * along + 4.5 * along * along);
  }
}
