import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { openNodeResultPlace } from '@wakeloom/tracker/node/result-place-node';
import { exportGrid, exportPathlines } from '@wakeloom/tracker/store/exports/registry';
import { openResult } from '@wakeloom/tracker/store/read-result';
import Papa from 'papaparse';
import { afterAll, expect, it } from 'vitest';
import { memorySink } from '../helpers/export-sources.js';
import { makeResult } from '../helpers/made-result.js';

const folder = mkdtempSync(join(tmpdir(), 'wakeloom-export-result-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));

it('exports a result folder as it was written, sample by sample and bin by bin', async () => {
  const place = await openNodeResultPlace(folder, { create: true });
  const written: Record<string, number>[] = [];
  await makeResult(place, { frames: 20, particles: 30, life: 9 }, {}, (rows) => {
    for (let k = 0; k + 1 < rows.offsets.length; k++) {
      for (let r = rows.offsets[k]!; r < rows.offsets[k + 1]!; r++) {
        const { frame, detection, time, x, y, u, ax, vSe, flags } = rows;
        const pathline = rows.firstPathline + k;
        written.push({
          pathline,
          frame: frame[r]!,
          detection: detection[r]!,
          t: time[r]!,
          x: x[r]!,
          y: y[r]!,
          u: u[r]!,
          ax: ax[r]!,
          v_se: vSe[r]!,
          flags: flags[r]!,
        });
      }
    }
  });
  const result = await openResult(place);
  try {
    const sink = memorySink();
    const summary = await exportPathlines(result.pathlines!, 'csv', sink, { rows: 37 });
    const rows = Papa.parse<Record<string, string>>(sink.text().trimEnd(), { header: true }).data;
    expect(rows.length).toBeGreaterThan(100);
    expect(rows).toHaveLength(written.length);
    expect(summary.remarks).toEqual([]);
    const single = new Set(['u', 'ax', 'v_se']);
    rows.forEach((row, r) => {
      for (const [name, value] of Object.entries(written[r]!)) {
        const text = row[name]!;
        const read = text === '' ? Number.NaN : single.has(name) ? Math.fround(Number(text)) : Number(text);
        expect(read, `${name} of row ${r}`).toBe(value);
      }
    });
    const gridSink = memorySink();
    await exportGrid(result.grid()!, result.pathlines!.units, 'csv', gridSink);
    const [head, first, second] = gridSink.text().split('\n');
    expect(head).toBe('x,y,samples,pathlines,u,v,u_se,uu');
    expect(first).toBe('0.5,1,10,1,0,0,0,0');
    expect(second).toBe('1,1,0,0,,,,');
  } finally {
    result.close();
  }
});
