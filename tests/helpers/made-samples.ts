import type { Dims, SampleBlock } from '@wakeloom/tracker/core/columns';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';

/** What `madeSamples` makes. */
export interface MadeOptions {
  readonly dims?: Dims;
  readonly frames: number;
  readonly particles: number;
  /** Samples of a pathline: between 1 and twice this less one, drawn anew for each. */
  readonly life: number;
  readonly framesPerBlock?: number;
  readonly seed?: number;
}

/**
 * Blocks of samples as the fit stage gives them, without meaning: positions are numbered so that every value tells
 * which pathline and frame it belongs to. Particles stay in their slot until their life ends; the next pathline takes
 * the slot. One pathline in seven skips each third frame of its life (bridging), one in fifty never moves.
 */
export function* madeSamples(options: MadeOptions): Generator<SampleBlock> {
  const { dims = 2, frames, particles, life, framesPerBlock = 8, seed = 1 } = options;
  const random = xoroshiro128plus(seed);
  const draw = () => (random.next() >>> 8) / 2 ** 24;
  const number = new Int32Array(particles).fill(-1);
  const left = new Int32Array(particles);
  const age = new Int32Array(particles);
  let nextPathline = 0;
  let row = 0;
  for (let first = 0; first < frames; first += framesPerBlock) {
    const count = Math.min(framesPerBlock, frames - first);
    const most = count * particles;
    const f32 = (on: boolean) => new Float32Array(on ? most : 0);
    const f64 = (on: boolean) => new Float64Array(on ? most : 0);
    const deep = dims === 3;
    const offsets = new Uint32Array(count + 1);
    const columns = {
      pathline: new Int32Array(most),
      x: f64(true),
      y: f64(true),
      z: f64(deep),
      u: f32(true),
      v: f32(true),
      w: f32(deep),
      ax: f32(true),
      ay: f32(true),
      az: f32(deep),
      xSe: f32(true),
      ySe: f32(true),
      zSe: f32(deep),
      uSe: f32(true),
      vSe: f32(true),
      wSe: f32(deep),
      axSe: f32(true),
      aySe: f32(true),
      azSe: f32(deep),
      measuredX: f64(true),
      measuredY: f64(true),
      measuredZ: f64(deep),
      linkRisk: f32(true),
      detection: f64(true),
      flags: new Uint16Array(most),
    };
    let used = 0;
    for (let k = 0; k < count; k++) {
      for (let slot = 0; slot < particles; slot++) {
        if (left[slot] === 0) {
          number[slot] = nextPathline++;
          left[slot] = 1 + Math.floor(draw() * (2 * life - 1));
          age[slot] = 0;
        }
        left[slot]--;
        const pathline = number[slot];
        const step = age[slot]++;
        if (pathline % 7 === 3 && step % 3 === 1 && left[slot] > 0) continue;
        const moving = pathline % 50 === 11 ? 0 : 1;
        const frame = first + k;
        columns.pathline[used] = pathline;
        columns.x[used] = pathline + moving * 0.001 * frame;
        columns.y[used] = -pathline + moving * 0.002 * frame;
        columns.u[used] = pathline % 5 === 0 ? Number.NaN : moving * (1 + (pathline % 10));
        columns.v[used] = moving * 0.5;
        columns.ax[used] = frame;
        columns.ay[used] = step;
        columns.xSe[used] = 0.01;
        columns.ySe[used] = 0.02;
        columns.uSe[used] = 0.1 + (pathline % 3) * 0.1;
        columns.vSe[used] = 0.3;
        columns.axSe[used] = 1;
        columns.aySe[used] = 2;
        columns.measuredX[used] = columns.x[used] + 0.25;
        columns.measuredY[used] = columns.y[used] - 0.25;
        columns.linkRisk[used] = step === 0 ? 0 : 1 / (2 + (pathline % 8));
        columns.detection[used] = row++;
        columns.flags[used] = (step === 0 ? 4 : 0) | (pathline % 13 === 5 ? 16 : 0);
        if (deep) {
          columns.z[used] = 0.5 * pathline;
          columns.w[used] = 0.125;
          columns.az[used] = 3;
          columns.zSe[used] = 0.03;
          columns.wSe[used] = 0.4;
          columns.azSe[used] = 4;
          columns.measuredZ[used] = columns.z[used] + 0.5;
        }
        used++;
      }
      offsets[k + 1] = used;
    }
    const cut = Object.fromEntries(
      Object.entries(columns).map(([key, values]) => [key, values.length === 0 ? values : values.subarray(0, used)]),
    ) as unknown as typeof columns;
    yield {
      dims,
      number: Int32Array.from({ length: count }, (_, k) => 10 + first + k),
      time: Float64Array.from({ length: count }, (_, k) => (first + k) / 64),
      segment: new Int32Array(count),
      offsets,
      ...cut,
    };
  }
}
