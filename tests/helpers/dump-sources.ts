import { createHash } from 'node:crypto';
import {
  type ByteSource,
  createContext,
  type DetectionBlock,
  type DumpScan,
  type DumpSettings,
} from '@wakeloom/tracker';
import { type DumpTools, openDump } from '@wakeloom/tracker/detections/open-dump';

/** Bytes or text as a source; `pieces` makes each read give at most that many bytes. */
export function memorySource(
  name: string,
  content: string | Uint8Array,
  pieces = Number.POSITIVE_INFINITY,
): ByteSource {
  const bytes = typeof content === 'string' ? new TextEncoder().encode(content) : content;
  return {
    name,
    size: bytes.length,
    modified: null,
    async read(position, into) {
      const part = bytes.subarray(position, Math.min(bytes.length, position + Math.min(pieces, into.length)));
      into.set(part);
      return part.length;
    },
    async close() {},
  };
}

const AUTO = {
  frame: 'auto',
  x: 'auto',
  y: 'auto',
  z: 'auto',
  brightness: 'auto',
  pathline: 'auto',
  time: 'auto',
} as const;

export type DumpOptions = Partial<Omit<DumpSettings, 'columns'>> & { columns?: Partial<DumpSettings['columns']> };

/** Settings as they are when the user says nothing, with changes. */
export function dumpSettings(options: DumpOptions = {}): DumpSettings {
  return {
    files: ['test'],
    format: 'auto',
    separator: 'auto',
    decimal: 'auto',
    header: 'auto',
    layout: 'one-file-a-run',
    dataset: null,
    badRowsLimit: 0.5,
    given: 'keep',
    ...options,
    columns: { ...AUTO, ...options.columns },
  };
}

export const testTools: DumpTools = {
  hasher: () => {
    const hash = createHash('sha256');
    return { update: (bytes) => void hash.update(bytes), hex: () => hash.digest('hex') };
  },
  hdf5: null,
  ramLimit: 256 * 2 ** 20,
};

export interface ReadDump {
  readonly scan: DumpScan;
  readonly blocks: readonly DetectionBlock[];
}

/** Scans a dump and reads all its blocks. */
export async function readDump(
  sources: readonly ByteSource[],
  options: DumpOptions = {},
  tools: Partial<DumpTools> = {},
  rows?: number,
): Promise<ReadDump> {
  const dump = openDump(sources, dumpSettings(options), { ...testTools, ...tools });
  const context = createContext();
  const scan = await dump.scan(context);
  const blocks: DetectionBlock[] = [];
  for await (const block of dump.blocks(context, rows)) blocks.push(block);
  return { scan, blocks };
}

/** One text file, read whole. */
export function readText(text: string, options: DumpOptions = {}, name = 'run.csv'): Promise<ReadDump> {
  return readDump([memorySource(name, text)], options);
}

/** Blocks as plain rows [frame, x, y, z, brightness, row, given, time]; NaN where there is none. */
export function flatRows(blocks: readonly DetectionBlock[]): number[][] {
  const rows: number[][] = [];
  for (const block of blocks) {
    for (let k = 0; k < block.number.length; k++) {
      for (let i = block.offsets[k]; i < block.offsets[k + 1]; i++) {
        rows.push([
          block.number[k],
          block.x[i],
          block.y[i],
          block.z[i] ?? Number.NaN,
          block.brightness[i] ?? Number.NaN,
          block.row[i],
          block.given[i] ?? Number.NaN,
          block.time[k],
        ]);
      }
    }
  }
  return rows;
}
