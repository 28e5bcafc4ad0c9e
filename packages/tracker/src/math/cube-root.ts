/**
 * Cube root of a positive number by Newton's iteration: Math.cbrt differs in its last bits between engines. Within two
 * units in the last place. Cost: some 10 steps near 1, one more for each factor of 3.4 away from it.
 */
export function cubeRoot(value: number): number {
  // From a start above the root the iteration falls steadily; it ends when rounding stops it.
  let x = Math.max(value, 1);
  for (;;) {
    const next = (2 * x + value / (x * x)) / 3;
    if (!(next < x)) return x;
    x = next;
  }
}
