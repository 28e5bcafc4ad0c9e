import { WakeloomError } from '../core/errors.js';
import type { SynthesisOptions } from './make-dump.js';
import { type RandomStream, randomStream } from './random-stream.js';
import { rungeKutta } from './runge-kutta.js';

/** Border round the view in which particles are moved too, as a share of the view's shorter side. */
const BORDER_SHARE = 0.05;
/** Fastest speed found on the sampling lattice is taken this much larger, for what lies between its points. */
const SPEED_MARGIN = 1.3;

/**
 * The particles of a synthetic experiment: even density in a box somewhat larger than the view. Columns, one
 * entry a particle in `x`, `y`, `z`, `identity`, `expiry`; the first `count` are alive. A particle keeps its identity
 * as long as it is in the box and in the light sheet.
 */
export class ParticleCloud {
  x: Float64Array;
  y: Float64Array;
  z: Float64Array;
  identity: Int32Array;
  count = 0;
  time: number;
  /** Particles that a step carried into a solid (an error of the flow's interpolation) and that were taken out. */
  lostInSolid = 0;

  private expiry: Float64Array;
  private nextIdentity = 0;
  private readonly options: SynthesisOptions;
  private readonly low: Float64Array;
  private readonly high: Float64Array;
  private readonly shell: number;
  private readonly density: number;
  private readonly seeding: RandomStream;
  private readonly stays: RandomStream;
  private readonly step4: (position: Float64Array, t: number) => void;
  private readonly position = new Float64Array(3);
  private readonly interval: number;
  private frame = 0;

  constructor(options: SynthesisOptions) {
    checkOptions(options);
    const { flow, region, rate } = options;
    this.options = options;
    this.interval = 1 / rate;
    this.time = options.startTime ?? 0;
    const sides = [region.x, region.y, ...(flow.dims === 3 ? [region.z as readonly [number, number]] : [])];
    const border = BORDER_SHARE * Math.min(...sides.map(([from, to]) => to - from));
    this.low = Float64Array.from(sides, ([from]) => from - border);
    this.high = Float64Array.from(sides, ([, to]) => to + border);
    const volume = sides.reduce((product, [from, to]) => product * (to - from), 1);
    const viewLow = Float64Array.from(sides, ([from]) => from);
    const viewHigh = Float64Array.from(sides, ([, to]) => to);
    this.density = options.perFrame / (volume * freeShare(options, viewLow, viewHigh));
    this.shell = this.shellWidth();
    this.seeding = randomStream(options.seed, 'seeding');
    this.stays = randomStream(options.seed, 'stay');
    const boxVolume = this.low.reduce((product, from, axis) => product * (this.high[axis] - from), 1);
    const capacity = Math.ceil(1.2 * this.density * boxVolume) + 1024;
    this.x = new Float64Array(capacity);
    this.y = new Float64Array(capacity);
    this.z = new Float64Array(flow.dims === 3 ? capacity : 0);
    this.identity = new Int32Array(capacity);
    this.expiry = new Float64Array(capacity);
    this.step4 = rungeKutta(flow, this.interval, options.substeps ?? 4);
    for (let left = Math.round(this.density * boxVolume); left > 0; left--) {
      this.drawIn(this.low, this.high);
      if (!this.solid()) this.add();
    }
  }

  /** Moves everything by one frame interval. */
  step(): void {
    const t = this.time;
    const until = (this.options.startTime ?? 0) + (this.frame + 1) * this.interval;
    let kept = 0;
    let replaced = 0;
    for (let i = 0; i < this.count; i++) {
      this.load(i);
      this.step4(this.position, t);
      if (!this.within(this.low, this.high)) continue;
      if (this.solid()) {
        this.lostInSolid++;
        replaced++;
      } else if (this.expiry[i] <= until) {
        replaced++;
      } else {
        this.identity[kept] = this.identity[i];
        this.expiry[kept] = this.expiry[i];
        this.store(kept++);
      }
    }
    this.count = kept;
    this.frame++;
    this.time = until;
    this.enter(t);
    for (let i = 0; i < replaced; i++) {
      do this.drawIn(this.low, this.high);
      while (this.solid());
      this.add();
    }
  }

  /**
   * Fluid from outside brings its own particles: an even Poisson population is drawn in a shell round the box, as
   * wide as the fastest fluid goes in one interval, moved by one interval, and who then lies in the box is taken on.
   */
  private enter(t: number): void {
    const outerLow = this.low.map((value) => value - this.shell);
    const outerHigh = this.high.map((value) => value + this.shell);
    const outer = outerLow.reduce((product, from, axis) => product * (outerHigh[axis] - from), 1);
    const inner = this.low.reduce((product, from, axis) => product * (this.high[axis] - from), 1);
    for (let left = this.seeding.poisson(this.density * (outer - inner)); left > 0; left--) {
      do this.drawIn(outerLow, outerHigh);
      while (this.within(this.low, this.high));
      if (this.solid()) continue;
      this.step4(this.position, t);
      if (this.within(this.low, this.high) && !this.solid()) this.add();
    }
  }

  private shellWidth(): number {
    const { flow, frames, startTime = 0 } = this.options;
    const velocity = new Float64Array(3);
    let fastest = 0;
    const duration = frames * this.interval;
    for (let round = 0; round < 2; round++) {
      const reach = SPEED_MARGIN * fastest * this.interval;
      const low = this.low.map((value) => value - reach);
      const high = this.high.map((value) => value + reach);
      for (let k = 0; k < 8; k++) {
        overLattice(low, high, (x, y, z) => {
          flow.velocity(x, y, z, startTime + (duration * k) / 8, velocity);
          const speed = Math.hypot(velocity[0], velocity[1], flow.dims === 3 ? velocity[2] : 0);
          if (speed > fastest) fastest = speed;
        });
      }
    }
    return SPEED_MARGIN * fastest * this.interval;
  }

  private drawIn(low: Float64Array, high: Float64Array): void {
    for (let axis = 0; axis < low.length; axis++) {
      this.position[axis] = low[axis] + (high[axis] - low[axis]) * this.seeding.uniform();
    }
  }

  private within(low: Float64Array, high: Float64Array): boolean {
    for (let axis = 0; axis < low.length; axis++) {
      if (!(this.position[axis] >= low[axis] && this.position[axis] < high[axis])) return false;
    }
    return true;
  }

  private solid(): boolean {
    return this.options.flow.inside?.(this.position[0], this.position[1], this.position[2]) ?? false;
  }

  private load(i: number): void {
    this.position[0] = this.x[i];
    this.position[1] = this.y[i];
    if (this.z.length > 0) this.position[2] = this.z[i];
  }

  private store(i: number): void {
    this.x[i] = this.position[0];
    this.y[i] = this.position[1];
    if (this.z.length > 0) this.z[i] = this.position[2];
  }

  private add(): void {
    if (this.count === this.x.length) this.grow();
    this.identity[this.count] = this.nextIdentity++;
    const stay = this.options.stay ?? Number.POSITIVE_INFINITY;
    // Memoryless stays: the first population is then as old as any later one, the experiment stationary.
    this.expiry[this.count] = stay === Number.POSITIVE_INFINITY ? stay : this.time + stay * this.stays.exponential();
    this.store(this.count++);
  }

  private grow(): void {
    const larger = Math.ceil(1.5 * this.x.length) + 16;
    const longer = (old: Float64Array) => {
      const fresh = new Float64Array(old.length === 0 ? 0 : larger);
      fresh.set(old);
      return fresh;
    };
    this.x = longer(this.x);
    this.y = longer(this.y);
    this.z = longer(this.z);
    this.expiry = longer(this.expiry);
    const identity = new Int32Array(larger);
    identity.set(this.identity);
    this.identity = identity;
  }
}

/** Calls `visit` at the points of a lattice that spans the box: 65 a side in the plane, 17 in space. */
function overLattice(low: Float64Array, high: Float64Array, visit: (x: number, y: number, z: number) => void): void {
  const cells = low.length === 3 ? 16 : 64;
  const at = (axis: number, k: number) => low[axis] + ((high[axis] - low[axis]) * k) / cells;
  for (let i = 0; i <= cells; i++) {
    for (let j = 0; j <= cells; j++) {
      for (let k = 0; k <= (low.length === 3 ? cells : 0); k++)
        visit(at(0, i), at(1, j), low.length === 3 ? at(2, k) : 0);
    }
  }
}

/** Share of the view that is fluid, from a midpoint lattice of 400 x 400 (plane) or 40^3 points. */
function freeShare(options: SynthesisOptions, low: Float64Array, high: Float64Array): number {
  const { flow } = options;
  if (flow.inside === undefined) return 1;
  const cells = low.length === 3 ? 40 : 400;
  const at = (axis: number, k: number) => low[axis] + ((high[axis] - low[axis]) * (k + 0.5)) / cells;
  let free = 0;
  let all = 0;
  for (let i = 0; i < cells; i++) {
    for (let j = 0; j < cells; j++) {
      for (let k = 0; k < (low.length === 3 ? cells : 1); k++) {
        all++;
        if (!flow.inside(at(0, i), at(1, j), low.length === 3 ? at(2, k) : 0)) free++;
      }
    }
  }
  if (free === 0)
    throw new WakeloomError(
      'usage/no-fluid',
      'region of the synthetic dump: got none outside the solid, expected some fluid in view',
    );
  return free / all;
}

function checkOptions(options: SynthesisOptions): void {
  const whole = (name: 'frames', value: number) => {
    if (!(Number.isInteger(value) && value >= 1)) throw wrong(name, value, 'a whole number of at least 1');
  };
  const positive = (name: string, value: number) => {
    if (!(value > 0 && Number.isFinite(value))) throw wrong(name, value, 'a number above 0');
  };
  const share = (name: string, value: number) => {
    if (!(value >= 0 && value < 1)) throw wrong(name, value, 'a share from 0 to below 1');
  };
  whole('frames', options.frames);
  positive('rate', options.rate);
  positive('perFrame', options.perFrame);
  positive('scale', options.scale);
  share('lossShare', options.lossShare);
  if (!(options.ghostShare >= 0)) throw wrong('ghostShare', options.ghostShare, 'a share of at least 0');
  if (options.stay !== undefined && !(options.stay > 0)) throw wrong('stay', options.stay, 'a time above 0 s');
  const { region, flow } = options;
  for (const side of ['x', 'y', ...(flow.dims === 3 ? ['z'] : [])] as ('x' | 'y' | 'z')[]) {
    const range = region[side];
    if (range === undefined || !(range[1] > range[0])) {
      throw wrong(`region.${side}`, range === undefined ? 'nothing' : range.join(' .. '), 'a lower and a higher bound');
    }
  }
}

function wrong(name: string, found: number | string, expected: string): WakeloomError {
  return new WakeloomError(
    'usage/synthesis-option',
    `${name}: got ${found}, expected ${expected} (options of a synthetic dump)`,
    {
      name,
    },
  );
}
