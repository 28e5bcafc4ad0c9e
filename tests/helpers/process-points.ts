import { type ByteSource, createContext, type RunRecord } from '@wakeloom/tracker';
import { nodeHasher, nodeHdf5, openNodeResultPlace } from '@wakeloom/tracker/node';
import { processRun } from '@wakeloom/tracker/pipeline/process-run';
import { resolveRun } from '@wakeloom/tracker/run/resolve';

/** One detection: frame number, position in px. */
export type DumpPoint = readonly [frame: number, x: number, y: number];

/** Processes detections, written as CSV, in this thread into a folder; `options` as on the command line. */
export async function processPoints(
  points: readonly DumpPoint[],
  folder: string,
  options: Readonly<Record<string, string>>,
): Promise<RunRecord> {
  const lines = points.map(([frame, x, y]) => `${frame},${x.toFixed(4)},${y.toFixed(4)}\n`);
  const bytes = new TextEncoder().encode(`frame,x,y\n${lines.join('')}`);
  const source: ByteSource = {
    name: 'dump.csv',
    size: bytes.length,
    modified: null,
    async read(position, into) {
      const part = bytes.subarray(position, position + into.length);
      into.set(part);
      return part.length;
    },
    close: async () => {},
  };
  const place = await openNodeResultPlace(folder, { create: true });
  const resolved = resolveRun({ options, dumpFiles: ['dump.csv'] });
  const tools = {
    sources: [source],
    hdf5: nodeHdf5,
    hasher: nodeHasher,
    place,
    host: { name: 'test', platform: 'test', runtime: 'test' },
    clock: { now: () => '2000-01-01T00:00:00Z', seconds: () => 0 },
  };
  return processRun({ resolved, programVersion: 'test' }, tools, createContext());
}
