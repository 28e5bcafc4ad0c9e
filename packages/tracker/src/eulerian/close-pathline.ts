import type { BinLayout } from './bin-layout.js';
import { PAIR_ENTRIES } from './bin-layout.js';

/**
 * Adds products of the sums of the bin's current pathline to `clusters` of `into` (which may be `sums` itself, or a
 * copy of the bin's stretch that starts at `at` too).
 */
export function closePathline(layout: BinLayout, sums: Float64Array, at: number, into: Float64Array): void {
  const { dims, pairs } = layout;
  const current = at + layout.current;
  const n = sums[current]!;
  if (n === 0) return;
  let to = at + layout.clusters;
  into[to] = into[to]! + n * n;
  into[at + layout.cubes] = into[at + layout.cubes]! + n * n * n;
  to++;
  for (let a = 0; a < dims; a++, to++) into[to] = into[to]! + n * sums[current + 1 + a]!;
  const ofPairs = current + 1 + dims;
  const fours = to + pairs.length;
  for (let k = 0; k < pairs.length; k++) {
    const [a, b] = pairs[k]!;
    const sa = sums[current + 1 + a]!;
    const sb = sums[current + 1 + b]!;
    const sab = sums[ofPairs + k]!;
    into[to + k] = into[to + k]! + sa * sb;
    const four = fours + PAIR_ENTRIES * k;
    into[four] = into[four]! + sab * n;
    into[four + 1] = into[four + 1]! + sab * sa;
    into[four + 2] = into[four + 2]! + sab * sb;
    into[four + 3] = into[four + 3]! + sab * sab;
  }
}
