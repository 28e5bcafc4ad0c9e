import { readFileSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import { type DemoName, demoSynthesis } from '@wakeloom/tracker/synthesis/demo';
import { type SynthesisOptions, synthesise } from '@wakeloom/tracker/synthesis/make-dump';

/** What the generator knows of every row of a demo's dump and never writes there, rows in the order of the dump. */
export interface DemoTruth {
  readonly dims: 2 | 3;
  readonly rows: number;
  readonly frame: Int32Array;
  /** True particle, -1 for a false detection. */
  readonly particle: Int32Array;
  /** Position of the particle itself, without noise, three numbers a row, mm, y up; NaN where not known. */
  readonly position: Float64Array;
  /** Velocity of the flow there and then, three numbers a row, mm/s; NaN where not known. */
  readonly velocity: Float64Array;
}

const WAKE = fileURLToPath(new URL('../../data/wake-re150.bin.gz', import.meta.url));

/** Bytes of the computed wake that the cylinder demo needs. */
export function wakeBytes(): Uint8Array {
  return new Uint8Array(readFileSync(WAKE));
}

/**
 * Truth of a demo of seed 1. True positions come from a second run of the generator without noise: every source of
 * chance draws from a stream of its own, so the same particles are seen; they are matched by frame and particle. A
 * particle that noise pushed out of one of the two views stays NaN.
 */
export async function demoTruth(name: DemoName): Promise<DemoTruth> {
  const options: SynthesisOptions = await demoSynthesis(name, { wake: wakeBytes() });
  const { flow, rate, scale, region } = options;
  const [frame, particle, position, velocity] = [[], [], [], []] as number[][];
  const exact = synthesise({ ...options, noisePx: 0, brightness: 0 });
  const here = new Float64Array(3);
  for (const seen of synthesise(options)) {
    const bare = exact.next().value!;
    const rowOf = new Map<number, number>();
    for (let row = 0; row < bare.particle.length; row++) rowOf.set(bare.particle[row], row);
    for (const id of seen.particle) {
      frame.push(seen.number);
      particle.push(id);
      const row = id < 0 ? undefined : rowOf.get(id);
      if (row === undefined) {
        position.push(Number.NaN, Number.NaN, Number.NaN);
        velocity.push(Number.NaN, Number.NaN, Number.NaN);
        continue;
      }
      const x = region.x[0] + bare.x[row] * scale;
      const y = region.y[1] - bare.y[row] * scale;
      const z = flow.dims === 3 ? region.z![0] + bare.z[row] * scale : 0;
      flow.velocity(x, y, z, seen.number / rate, here);
      position.push(x, y, z);
      velocity.push(here[0], here[1], flow.dims === 3 ? here[2] : 0);
    }
  }
  return {
    dims: flow.dims,
    rows: frame.length,
    frame: Int32Array.from(frame),
    particle: Int32Array.from(particle),
    position: Float64Array.from(position),
    velocity: Float64Array.from(velocity),
  };
}
