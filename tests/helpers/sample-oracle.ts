import { EXCLUDED_FROM_GRID, FLAG } from '@wakeloom/tracker';
import type { RowKey } from '@wakeloom/tracker/store/sample-columns';
import { sampleColumns } from '@wakeloom/tracker/store/sample-columns';
import { median } from 'simple-statistics';
import { type MadeOptions, madeSamples } from './made-samples.js';

interface Row {
  readonly pathline: number;
  readonly values: Record<RowKey, number>;
}

/**
 * What a result of these samples must hold, the plain way: all rows as objects, grouped by pathline with a Map, flags
 * and counts by looking at each pathline whole.
 */
export function sampleOracle(
  made: MadeOptions,
  rule: { readonly shortest: number; readonly stuckFactor: number; readonly noise: readonly number[] },
) {
  const columns = sampleColumns(made.dims ?? 2, false);
  const byPathline = new Map<number, Row[]>();
  for (const block of madeSamples(made)) {
    for (let frame = 0; frame < block.number.length; frame++) {
      for (let row = block.offsets[frame]; row < block.offsets[frame + 1]; row++) {
        const values = {} as Record<RowKey, number>;
        for (const { key } of columns) {
          values[key] = key === 'frame' ? block.number[frame] : key === 'time' ? block.time[frame] : block[key][row];
        }
        const pathline = block.pathline[row];
        byPathline.set(pathline, [...(byPathline.get(pathline) ?? []), { pathline, values }]);
      }
    }
  }
  const sorted = [...byPathline.entries()].sort((a, b) => a[0] - b[0]).map(([, rows]) => rows);
  const kept = sorted.filter((rows) => rows.length >= rule.shortest);
  const short = sorted.filter((rows) => rows.length > 1 && rows.length < rule.shortest);
  const axes = (['x', 'y', 'z'] as const).slice(0, made.dims ?? 2);
  for (const rows of kept) {
    const middle = axes.map((axis) => median(rows.map((row) => row.values[axis])));
    const near = rows.filter((row) =>
      axes.every((axis, i) => Math.abs(row.values[axis] - middle[i]) <= (rule.stuckFactor * rule.noise[i]) / 2),
    );
    if (near.length >= 0.8 * rows.length) for (const row of rows) row.values.flags |= FLAG.stuck;
  }
  const all = kept.flat();
  const good = all.filter((row) => (row.values.flags & EXCLUDED_FROM_GRID) === 0);
  const speeds = good
    .map(({ values }) => Math.sqrt(values.u ** 2 + values.v ** 2))
    .filter((speed) => !Number.isNaN(speed));
  const bridging = kept.flatMap((rows) =>
    rows.filter((row, i) => i > 0 && row.values.frame - rows[i - 1].values.frame > 1),
  );
  return {
    samples: all.length,
    rowSize: kept.map((rows) => rows.length),
    columns: Object.fromEntries(columns.map(({ key }) => [key, all.map((row) => row.values[key])])),
    meanSpeed: speeds.reduce((sum, speed) => sum + speed, 0) / speeds.length,
    peakSpeed: Math.max(...speeds),
    medianVelocitySe: median(good.map((row) => row.values.uSe)),
    counts: {
      samples: all.length,
      pathlines: kept.length,
      shortFragments: short.length,
      shortFragmentDetections: short.flat().length,
      links: all.length - kept.length,
      linksBridging: bridging.length,
      unflagged: good.length,
      medianPathlineSamples: median(kept.map((rows) => rows.length)),
      flagged: Object.fromEntries(
        Object.entries(FLAG).map(([name, bit]) => [name, all.filter((row) => (row.values.flags & bit) !== 0).length]),
      ),
    },
  };
}
