import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import * as tracker from '@wakeloom/tracker';
import * as node from '@wakeloom/tracker/node';
import { afterAll, expect, it } from 'vitest';
import { uniformPoints } from '../helpers/points';

const folder = mkdtempSync(join(tmpdir(), 'wakeloom-surface-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));

/** What others may build on. A name that goes or changes its meaning wants a new major version. */
it('is this, and nothing went unnoticed', () => {
  expect(Object.keys(tracker).sort()).toEqual([
    'EXCLUDED_FROM_GRID',
    'EXPORTERS',
    'FLAG',
    'FLAG_MEANING',
    'NAN',
    'SCHEMA_VERSION',
    'WakeloomError',
    'abortedError',
    'binIndex',
    'createContext',
    'findExporter',
    'fromPlainError',
    'isCompleteResult',
    'isWakeloomError',
    'openResult',
    'parseRunSheet',
    'processRun',
    'resolveRun',
    'rowCount',
    'seedFor',
    'toPlainError',
  ]);
  expect(Object.keys(node).sort()).toEqual([
    'nodeHasher',
    'nodeHdf5',
    'nodeScratch',
    'openFileSink',
    'openFileSource',
    'openNodeResultPlace',
    'processInWorker',
  ]);
});

it('works a dump from a program of one page', async () => {
  const places = uniformPoints(200, 2, 12, 400);
  const lines = ['frame,x,y'];
  for (let k = 0; k < 12; k++) for (let p = 0; p < 200; p++) lines.push(`${k},${places.x[p] + 3 * k},${places.y[p]}`);
  const dump = join(folder, 'dump.csv');
  writeFileSync(dump, `${lines.join('\n')}\n`);

  const resolved = tracker.resolveRun({ options: { rate: '100 Hz', scale: '0.1 mm/px' }, dumpFiles: [dump] });
  const request = { resolved, programVersion: 'example' };
  const record = await node.processInWorker(request, [dump], join(folder, 'out'), { threads: 1, ramLimit: 256e6 });
  const result = await tracker.openResult(await node.openNodeResultPlace(join(folder, 'out'), { create: false }));
  expect(record.counts.pathlines).toBe(200);
  // 3 px of 0.1 mm in 0.01 s.
  expect(record.figures.meanSpeed).toBeCloseTo(30, 4);
  expect(result.record.digest.content).toBe(record.digest.content);
  result.close();
});
