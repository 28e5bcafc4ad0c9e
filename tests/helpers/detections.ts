import type { DetectionBlock, Dims, DumpScan, RunEvent, RunSettings } from '@wakeloom/tracker';
import { createContext } from '@wakeloom/tracker';
import { calibrate, newTally } from '@wakeloom/tracker/detections/calibrate';
import { resolveRun } from '@wakeloom/tracker/run/resolve';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';

/** Uniform numbers in [0, 1) from a seed. */
export function uniform(seed: number): () => number {
  const generator = xoroshiro128plus(seed);
  return () => (generator.next() >>> 0) / 4294967296;
}

/** A block of frames with the given rows each, positions uniform in a box of 1000 x 800 x 300 dump units. */
export function randomBlock(dims: Dims, rows: readonly number[], seed: number, firstFrame = 0): DetectionBlock {
  const random = uniform(seed);
  const n = rows.reduce((sum, count) => sum + count, 0);
  const offsets = new Uint32Array(rows.length + 1);
  for (const [k, count] of rows.entries()) offsets[k + 1] = offsets[k]! + count;
  const column = (length: number, scale: number) => Float64Array.from({ length }, () => random() * scale);
  return {
    dims,
    number: Int32Array.from(rows, (_, k) => firstFrame + k),
    time: new Float64Array(rows.length).fill(Number.NaN),
    segment: new Int32Array(rows.length),
    offsets,
    x: column(n, 1000),
    y: column(n, 800),
    z: column(dims === 3 ? n : 0, 300),
    brightness: Float32Array.from(column(n, 255)),
    row: Float64Array.from({ length: n }, (_, i) => i),
    given: Int32Array.from(column(n, 50)),
  };
}

/** One frame (number 0) of given places: [x, y] or [x, y, z]. */
export function blockOf(...points: (readonly number[])[]): DetectionBlock {
  const dims = points[0]?.length === 3 ? 3 : 2;
  return {
    dims,
    number: Int32Array.of(0),
    time: Float64Array.of(Number.NaN),
    segment: Int32Array.of(0),
    offsets: Uint32Array.of(0, points.length),
    x: Float64Array.from(points, (point) => point[0]!),
    y: Float64Array.from(points, (point) => point[1]!),
    z: Float64Array.from(dims === 3 ? points : [], (point) => point[2]!),
    brightness: new Float32Array(0),
    row: Float64Array.from(points, (_, i) => i),
    given: new Int32Array(0),
  };
}

/** A copy that shares nothing. */
export function copyBlock(block: DetectionBlock): DetectionBlock {
  return structuredClone(block);
}

/** The same block with the rows of each frame shuffled. */
export function shuffled(block: DetectionBlock, seed: number): DetectionBlock {
  const random = uniform(seed);
  const copy = copyBlock(block);
  const columns = [copy.x, copy.y, copy.z, copy.brightness, copy.row, copy.given].filter((c) => c.length > 0);
  for (let k = 0; k < block.number.length; k++) {
    const start = block.offsets[k]!;
    for (let i = block.offsets[k + 1]! - 1; i > start; i--) {
      const j = start + Math.floor(random() * (i - start + 1));
      for (const column of columns) {
        const keep = column[i]!;
        column[i] = column[j]!;
        column[j] = keep;
      }
    }
  }
  return copy;
}

/** Default settings with some parts put in place of the resolved ones. */
export function settingsWith(parts: Partial<RunSettings>): RunSettings {
  return { ...resolveRun({ options: {}, dumpFiles: ['a.csv'] }).settings, ...parts };
}

/** A geometry by scale with every part at its neutral value but those given. */
export function scaleGeometry(
  parts: Partial<Extract<RunSettings['geometry'], { kind: 'scale' }>>,
): Extract<RunSettings['geometry'], { kind: 'scale' }> {
  return {
    kind: 'scale',
    scale: { value: 1, unit: 'mm/px', standardUncertainty: 0 },
    scaleZ: null,
    origin: [0, 0, 0],
    originUncertainty: null,
    rotation: { value: 0, unit: 'deg', standardUncertainty: null },
    yAxis: 'up',
    pixelOrigin: 'corner',
    frame: { velocity: null },
    region: null,
    ...parts,
  };
}

/** A scan that says what calibration looks at. */
export function scanOf(block: DetectionBlock, firstFrame = block.number[0] ?? 0): DumpScan {
  const rows = block.offsets[block.number.length]!;
  return {
    files: [],
    format: 'text',
    dims: block.dims,
    has: { brightness: block.brightness.length > 0, pathline: block.given.length > 0, time: false },
    columns: {},
    rowsPresent: rows,
    rowsRead: rows,
    setAside: [],
    frameNumbers: Int32Array.of(firstFrame),
    frameCounts: Uint32Array.of(rows),
    timeStep: Number.NaN,
    ordered: true,
    bounds: { min: [0, 0, 0], max: [0, 0, 0] },
    remarks: [],
  };
}

/** Calibrates copies of the blocks and gives back what came out, the tally and the events. */
export async function calibrated(settings: RunSettings, ...blocks: DetectionBlock[]) {
  const tally = newTally();
  const events: RunEvent[] = [];
  const context = createContext({ onEvent: (event) => events.push(event) });
  async function* source() {
    for (const block of blocks) yield copyBlock(block);
  }
  const out: DetectionBlock[] = [];
  const input = { settings, scan: scanOf(blocks[0]!), context, tally };
  for await (const block of calibrate(input, source())) out.push(block);
  return { blocks: out, block: out[0]!, tally, events };
}
