import type { LinkedBlock } from '../core/columns.js';

/** Displacements a frame interval over the mean spacing: mean and 95th percentile over all unbridged links. */
export interface DisplacementRatios {
  readonly mean: number;
  readonly p95: number;
}

/** Displacement ratios of linked frames. NaN where no link joins two successive frames. */
export function linkDisplacements(blocks: readonly LinkedBlock[], spacing: number): DisplacementRatios {
  const ratios: number[] = [];
  let sum = 0;
  let last = new Map<number, number>();
  let lastNumber = Number.NaN;
  let x: number[] = [];
  let y: number[] = [];
  let z: number[] = [];
  for (const block of blocks) {
    for (let k = 0; k < block.number.length; k++) {
      const now = new Map<number, number>();
      const nx: number[] = [];
      const ny: number[] = [];
      const nz: number[] = [];
      for (let row = block.offsets[k]; row < block.offsets[k + 1]; row++) {
        const at = nx.push(block.x[row]) - 1;
        ny.push(block.y[row]);
        nz.push(block.dims === 3 ? block.z[row] : 0);
        const id = block.pathline[row];
        now.set(id, at);
        const before = block.number[k] - lastNumber === 1 ? last.get(id) : undefined;
        if (before === undefined) continue;
        const dx = nx[at] - x[before];
        const dy = ny[at] - y[before];
        const dz = nz[at] - z[before];
        const ratio = Math.sqrt(dx * dx + dy * dy + dz * dz) / spacing;
        sum += ratio;
        ratios.push(ratio);
      }
      last = now;
      lastNumber = block.number[k];
      [x, y, z] = [nx, ny, nz];
    }
  }
  if (ratios.length === 0) return { mean: Number.NaN, p95: Number.NaN };
  const sorted = Float64Array.from(ratios).sort();
  return { mean: sum / ratios.length, p95: sorted[Math.min(sorted.length - 1, Math.floor(0.95 * sorted.length))] };
}
