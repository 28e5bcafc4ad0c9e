import { type Box, FlowGrid, type FlowGridData } from './flow-grid.js';
import { PICTURES } from './predictors.js';

/** Cell edge over that of the first look, and share kept from frame to frame, of each picture. */
const KINDS = [
  // Long memory: steady flows, where many frames make a quiet picture.
  { edge: 1, keep: 0.88 },
  // Short memory: flows that change or are carried past.
  { edge: 1, keep: 0.4 },
  // Fine cells: small vortices and steep shear.
  { edge: 0.7, keep: 0.7 },
] as const;

/** Several pictures of one flow that differ in what they average over; the predictors measure which serves where. */
export class FlowPictures {
  readonly all: readonly FlowGrid[];

  constructor(first: FlowGridData) {
    const seed = new FlowGrid({ ...first, moments: first.moments.slice() });
    this.all = KINDS.slice(0, PICTURES).map(({ edge }) =>
      edge === 1 ? new FlowGrid({ ...first, moments: first.moments.slice() }) : resampled(seed, edge * first.edge),
    );
  }

  /** The picture that pathlines keep their averaged deviation from. */
  get main(): FlowGrid {
    return this.all[0];
  }

  fade(): void {
    for (const [p, picture] of this.all.entries()) picture.fade(KINDS[p].keep);
  }

  learn(x: number, y: number, z: number, u: number, v: number, w: number): void {
    for (const picture of this.all) picture.learn(x, y, z, u, v, w);
  }

  fit(): void {
    for (const picture of this.all) picture.fit();
  }
}

/** The same flow on other cells: each learns the velocities at its centre and half way to its faces. */
function resampled(from: FlowGrid, edge: number): FlowGrid {
  const to = FlowGrid.empty(from.dims, boxOf(from), edge);
  const centre = new Float64Array(3);
  const flow = new Float64Array(3);
  const shifts = [[0, 0, 0]];
  for (let axis = 0; axis < from.dims; axis++) {
    for (const side of [-1, 1]) shifts.push([0, 1, 2].map((a) => (a === axis ? 0.25 * side * edge : 0)));
  }
  for (let cell = 0; cell < to.cells; cell++) {
    to.centre(cell, centre);
    for (const [a, b, c] of shifts) {
      const [x, y, z] = [centre[0] + a, centre[1] + b, centre[2] + c];
      if (from.at(x, y, z, flow) > 0) to.learnIn(cell, 1, x, y, z, flow[0], flow[1], flow[2]);
    }
  }
  to.fit();
  return to;
}

function boxOf(grid: FlowGrid): Box {
  const half = 0.5 * grid.edge;
  const deep = grid.dims === 3 ? half : 0;
  const last = [grid.countX - 1, grid.countY - 1, grid.countZ - 1].map((count) => count * grid.edge);
  return {
    min: [grid.firstX - half, grid.firstY - half, grid.firstZ - deep],
    max: [grid.firstX + last[0] + half, grid.firstY + last[1] + half, grid.firstZ + last[2] + deep],
  };
}
