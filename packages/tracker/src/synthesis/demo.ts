import type { ByteSink } from '../core/bytes.js';
import { WakeloomError } from '../core/errors.js';
import { displacementRatio } from './displacement-ratio.js';
import { type CsvCounts, dumpToCsv } from './dump-to-csv.js';
import { burgersVortex } from './flows-vortices.js';
import { gzipSink } from './gzip-sink.js';
import { type SynthesisOptions, type SyntheticFrame, synthesise } from './make-dump.js';
import { decodeWake } from './wake-file.js';
import { wakeFlow } from './wake-flow.js';

/** Demos by name: a light sheet behind a cylinder, a volume in a swirling through-flow. Both invented. */
export const DEMO_NAMES = ['cylinder-wake', 'swirl'] as const;
export type DemoName = (typeof DEMO_NAMES)[number];

/** What a demo may be told. */
export interface DemoOptions {
  /** Bytes of data/wake-re150.bin.gz; needed by `cylinder-wake`, since the library reads no files. */
  readonly wake?: Uint8Array;
  /** Default 1. The same seed gives the same dump. */
  readonly seed?: number;
  /** Frames, fewer for a quick look; default as the demo's (600 and 300). */
  readonly frames?: number;
  /** Called after each frame with frames done and frames in all. */
  readonly onFrame?: (done: number, total: number) => void;
}

/** What `writeDemo` wrote. */
export interface DemoSummary {
  /** File names as they were handed to `makeSink`. */
  readonly dump: string;
  readonly sheet: string;
  readonly frames: number;
  readonly rows: number;
  /** Mean displacement a frame over the mean spacing of particles. */
  readonly displacementRatio: number;
}

/** Kinematic viscosity of water at 20 degC, mm2/s (IAPWS R12-08 and SR6-08: 1.0034e-6 m2/s). */
const VISCOSITY = 1.0034;

const CYLINDER = { diameter: 5, speed: 30 };

/**
 * What the dump of a demo is made from, with the truth in its `flow`. `cylinder-wake`: 5 mm in 30 mm/s of water at
 * 20 degC (Reynolds number 150), 1280 x 1024 px at 0.05 mm/px, cylinder axis at px (240, 512), 60 Hz. `swirl`:
 * Burgers vortex (fastest swirl about 20 mm/s at r = 2.2 mm) in a stream along z that the axial strain speeds up from 10 to 22 mm/s.
 * Throws `usage/demo-wake` without the wake's bytes, `usage/wake-file` when they are none.
 */
export async function demoSynthesis(name: DemoName, options: DemoOptions = {}): Promise<SynthesisOptions> {
  const { seed = 1 } = options;
  const common = { rate: 60, perFrame: 2000, scale: 0.05, lossShare: 0.05, ghostShare: 0.05, seed, substeps: 2 };
  if (name === 'swirl') {
    return {
      ...common,
      flow: burgersVortex(440, 1, VISCOSITY, 10),
      frames: options.frames ?? 300,
      rate: 45,
      region: { x: [-12, 12], y: [-12, 12], z: [0, 12] },
      // Along the line of sight three times the noise in the plane (common practice: two to four times).
      noisePx: [0.1, 0.1, 0.3],
    };
  }
  if (options.wake === undefined) {
    throw new WakeloomError(
      'usage/demo-wake',
      'demo "cylinder-wake": got no wake field, expected the bytes of data/wake-re150.bin.gz',
    );
  }
  return {
    ...common,
    flow: wakeFlow(await decodeWake(options.wake), CYLINDER),
    frames: options.frames ?? 600,
    region: { x: [-12, 52], y: [-25.6, 25.6] },
    noisePx: 0.1,
    // Laminar two-dimensional shedding: little crosses the sheet; a particle stays for three transits of 1 s.
    stay: 3,
  };
}

/**
 * Writes a demo: its dump and its run sheet, each to the sink that `makeSink` gives for the file name; sinks are
 * closed. The true particles are written nowhere. The same options give the same bytes on one JavaScript engine.
 * Cost: about 5 s for the cylinder's 1.2 million detections.
 */
export async function writeDemo(
  name: DemoName,
  makeSink: (fileName: string) => ByteSink | Promise<ByteSink>,
  options: DemoOptions = {},
): Promise<DemoSummary> {
  const synthesis = await demoSynthesis(name, options);
  const dump = name === 'swirl' ? 'swirl.csv' : 'cylinder-wake.csv.gz';
  const sheet = `${name}.yaml`;
  const plain = await makeSink(dump);
  const sink = dump.endsWith('.gz') ? gzipSink(plain) : plain;
  let counts: CsvCounts;
  try {
    counts = await dumpToCsv(watched(synthesise(synthesis), synthesis.frames, options.onFrame), sink);
  } finally {
    await sink.close();
  }
  const sheetSink = await makeSink(sheet);
  await sheetSink.write(new TextEncoder().encode(demoSheet(name, dump)));
  await sheetSink.close();
  return { dump, sheet, frames: counts.frames, rows: counts.rows, displacementRatio: displacementRatio(synthesis) };
}

function* watched(
  frames: Iterable<SyntheticFrame>,
  total: number,
  onFrame: DemoOptions['onFrame'],
): Generator<SyntheticFrame> {
  let done = 0;
  for (const frame of frames) {
    yield frame;
    onFrame?.(++done, total);
  }
}

/** Text of the run sheet that belongs to a demo's dump. */
export function demoSheet(name: DemoName, dumpFile: string): string {
  if (name === 'swirl') {
    return `# Demo, invented: particles in a volume of water that swirls about z while it speeds up along z.
run: swirl in a through-flow
dump: { files: ${dumpFile}, columns: { frame: frame, x: x, y: y, z: z, brightness: intensity } }
clock: { rate: 45 Hz }
geometry: { scale: 0.05 mm/px, origin: [240, 240, 0] px, y-axis: down, pixel-origin: corner }
fluid: { water: 20 degC }
tracers: { diameter: 20 um, density: 1030 kg/m3 }
grid: { bin: 2 mm }
notes: { remark: "made by wakeloom demo; no measurement" }
`;
  }
  return `# Demo, invented: light sheet behind a cylinder in a small water tunnel, Reynolds number 150.
run: cylinder, 30 mm/s
dump: { files: ${dumpFile}, columns: { frame: frame, x: x, y: y, brightness: intensity } }
clock: { rate: 60 Hz }
geometry: { scale: 0.05 mm/px, origin: [240, 512] px, y-axis: down, pixel-origin: corner }
fluid: { water: 20 degC }
stream: { speed: 30 mm/s, direction: +x }
body: [ { circle: { centre: [0, 0] mm, diameter: 5 mm } } ]
tracers: { diameter: 20 um, density: 1030 kg/m3 }
grid: { bin: 1 mm }
notes: { remark: "made by wakeloom demo; no measurement" }
`;
}
