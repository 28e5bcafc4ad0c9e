import { CX, CY } from './lattice-directions.js';

/** Links from a fluid cell into a solid one; one entry a link. */
export interface WallLinks {
  /** Index of the fluid cell. */
  readonly fluid: Int32Array;
  /** Direction of the link, from the fluid into the wall. */
  readonly direction: Int8Array;
  /** Share of the link that lies in the fluid, 0 to 1. */
  readonly share: Float64Array;
}

/**
 * All links that cross the wall, the crossing found by bisection of the distance function. The outermost ring has
 * none. Cost: eight calls of `wall` a fluid cell, 48 more a link.
 */
export function findWallLinks(shape: {
  readonly width: number;
  readonly height: number;
  readonly wall?: (x: number, y: number) => number;
}): WallLinks {
  const { width, height, wall } = shape;
  const fluid: number[] = [];
  const direction: number[] = [];
  const share: number[] = [];
  for (let j = 1; wall !== undefined && j < height - 1; j++) {
    for (let i = 1; i < width - 1; i++) {
      if (!(wall(i, j) > 0)) continue;
      for (let d = 1; d < 9; d++) {
        if (wall(i + CX[d], j + CY[d]) > 0) continue;
        let low = 0;
        let high = 1;
        for (let halving = 0; halving < 48; halving++) {
          const middle = 0.5 * (low + high);
          if (wall(i + middle * CX[d], j + middle * CY[d]) > 0) low = middle;
          else high = middle;
        }
        fluid.push(j * width + i);
        direction.push(d);
        share.push(high);
      }
    }
  }
  return { fluid: Int32Array.from(fluid), direction: Int8Array.from(direction), share: Float64Array.from(share) };
}
