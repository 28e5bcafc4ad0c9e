import type { Dims, LinkedBlock } from '@wakeloom/tracker/core/columns';
import { randomStream } from '@wakeloom/tracker/synthesis/random-stream';
import { type LinkedPoint, linkedBlock } from './linked.js';

/** What made-up pathlines are like. */
export interface TrackOptions {
  readonly seed: string;
  readonly frames: number;
  readonly particles: number;
  readonly dims?: Dims;
  readonly noise?: number;
  readonly losses?: number;
  /** Share of detections displaced by 3 in x. */
  readonly outliers?: number;
  /** Mean life in frames; the particle is then born anew somewhere else. */
  readonly life?: number;
  readonly timeOf?: (frame: number) => number;
}

/**
 * Particles in a unit-speed field of eddies in a 60 x 60 (x 60) box, with losses, births, outliers and a missing
 * frame; the truth of the mean motion is of no concern here, only that pathlines are of every sort.
 */
export function madeTracks(options: TrackOptions): LinkedBlock {
  const random = randomStream(17, options.seed);
  const { frames, particles, dims = 2, noise = 0.02, losses = 0.05, outliers = 0, life = 30 } = options;
  const place = Array.from({ length: particles }, () => [0, 1, 2].map(() => 60 * random.uniform()));
  const number = Array.from({ length: particles }, (_, p) => p);
  let next = particles;
  const points: LinkedPoint[] = [];
  for (let frame = 0; frame < frames; frame++) {
    for (let p = 0; p < particles; p++) {
      const at = place[p]!;
      const [x = 0, y = 0] = at;
      at[0] = x + 0.5 + 0.3 * Math.sin(x / 9) * Math.cos(y / 9);
      at[1] = y - 0.3 * Math.cos(x / 9) * Math.sin(y / 9);
      at[2] = at[2]! + 0.1;
      if (random.uniform() < 1 / life || at[0] > 60) {
        place[p] = [0, 1, 2].map(() => 60 * random.uniform());
        number[p] = next++;
        continue;
      }
      if (random.uniform() < losses || frame % 17 === 9) continue;
      const shift = random.uniform() < outliers ? 3 : 0;
      points.push({
        frame: frame + 100,
        pathline: random.uniform() < 0.02 ? -1 : number[p]!,
        x: at[0] + shift + noise * random.normal(),
        y: at[1]! + noise * random.normal(),
        z: at[2]! + 2 * noise * random.normal(),
        risk: 0.6 * random.uniform() ** 8,
      });
    }
  }
  return linkedBlock(points, { dims, timeOf: options.timeOf });
}
