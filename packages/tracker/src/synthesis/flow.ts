import type { Dims } from '../core/columns.js';

/**
 * A velocity field with a known answer. Any consistent units; the demos and dumps use mm and s.
 * Implementations keep no state between calls that changes an answer, so one flow may be shared.
 */
export interface Flow {
  /** Short name for messages and files. */
  readonly name: string;
  readonly dims: Dims;
  /**
   * Velocity at (x, y, z) and time t, written to `into[0 .. dims - 1]` (length at least `dims`). Planar flows
   * ignore z. Inside a solid the velocity is zero.
   */
  velocity(x: number, y: number, z: number, t: number, into: Float64Array): void;
  /** True inside a solid, where no particle can be. Absent: there is none. */
  inside?(x: number, y: number, z: number): boolean;
}
