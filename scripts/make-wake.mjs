// Computes the wake of a circular cylinder at Reynolds number 150 and writes data/wake-re150.bin.gz.
//
//   npm run compile && node scripts/make-wake.mjs      (about a quarter of an hour on one core)
//   node scripts/make-wake.mjs --try --out FILE        (coarse and short, to see that it runs)
//
// First a coarse lattice runs until it sheds steadily, once in the chosen width and once in a wider one, which
// tells what the width does to the frequency. The fine lattice starts from the coarse flow, settles, and is then
// resolved by phase. The file's format is described in data/README.md and read by synthesis/wake-file.ts.

import { writeFileSync } from 'node:fs';
import { gzipSync } from 'node:zlib';
import { Lattice } from '../packages/tracker/dist/synthesis/lattice-boltzmann.js';
import { encodeWake } from '../packages/tracker/dist/synthesis/wake-file.js';

const REYNOLDS = 150;
/** Lattice speed of the stream: Mach number 0.104. */
const SPEED = 0.06;
/** Drag coefficient behind the source in the far field (check value: published 1.32 at Reynolds number 150). */
const DRAG = 1.32;
/** Edges of the domain from the centre of the cylinder, diameters. */
const UPSTREAM = 7;
const DOWNSTREAM = 15;
const SPONGE = 3;
/** Stored: edges in diameters, nodes a diameter, harmonics. */
const STORED = { left: -3.125, right: 11.25, top: 6, perDiameter: 32, harmonics: 8 };

const argument = (name, fallback) => {
  const at = process.argv.indexOf(`--${name}`);
  return at < 0 ? fallback : process.argv[at + 1];
};
const trial = process.argv.includes('--try');
const out = argument('out', new URL('../data/wake-re150.bin.gz', import.meta.url).pathname);

/** A lattice with the cylinder in an unbounded stream: its sides carry stream, doublet and the wake's source. */
function makeCase(cells, halfWidth) {
  const centreX = UPSTREAM * cells;
  const centreY = halfWidth * cells;
  const radius = cells / 2;
  const farField = (i, j) => {
    const x = i - centreX;
    const y = j - centreY;
    const r2 = x * x + y * y;
    // Doublet of the cylinder, and the source of strength drag / (density * speed) that makes room for the wake's
    // deficit (I. Imai, Proc. R. Soc. A 208 (1951) 487-516; derivable from the momentum balance).
    const doublet = (radius * radius) / (r2 * r2);
    const source = (DRAG * cells) / (4 * Math.PI * r2);
    return [SPEED * (1 - doublet * (x * x - y * y) + source * x), SPEED * (-2 * doublet * x * y + source * y)];
  };
  const lattice = new Lattice({
    width: (UPSTREAM + DOWNSTREAM) * cells + 1,
    height: 2 * halfWidth * cells + 1,
    viscosity: (SPEED * cells) / REYNOLDS,
    wall: (x, y) => Math.hypot(x - centreX, y - centreY) - radius,
    border: 'open',
    edge: farField,
    sponge: SPONGE * cells,
  });
  return { lattice, cells, centreX, centreY, radius, farField };
}

/** Steps `count` times; gathers upward zero crossings of the lift and the drag. */
function run(flow, count, record) {
  const { lattice, cells } = flow;
  const scale = 2 / (SPEED * SPEED * cells);
  for (let k = 0; k < count; k++) {
    lattice.step();
    const lift = scale * lattice.forceY;
    if (record.lift < 0 && lift >= 0) record.crossings.push(record.steps + record.lift / (record.lift - lift));
    record.lift = lift;
    record.steps++;
    record.drags.push(scale * lattice.forceX);
    record.lifts.push(lift);
  }
}

const emptyRecord = () => ({ steps: 0, lift: Number.NaN, crossings: [], drags: [], lifts: [] });

/** Frequency from the last `cycles` crossings, and its spread over single cycles. */
function strouhalOf(record, cells, cycles) {
  const marks = record.crossings.slice(-cycles - 1);
  const periods = marks.slice(1).map((mark, k) => mark - marks[k]);
  const mean = (marks[marks.length - 1] - marks[0]) / periods.length;
  const spread = Math.sqrt(periods.reduce((sum, p) => sum + (p - mean) ** 2, 0) / periods.length);
  const from = Math.round(marks[0]);
  const to = Math.round(marks[marks.length - 1]);
  const average = (list, power = 1) => list.slice(from, to).reduce((sum, v) => sum + v ** power, 0) / (to - from);
  return {
    cycles: periods.length,
    period: mean,
    strouhal: cells / (SPEED * mean),
    spread: spread / mean,
    drag: average(record.drags),
    liftRms: Math.sqrt(average(record.lifts, 2)),
  };
}

/** Convective time (diameters over speed) in steps. */
const convective = (cells) => cells / SPEED;

function say(text) {
  process.stdout.write(`${text}\n`);
}

function coarse(cells, halfWidth, time, cycles) {
  const flow = makeCase(cells, halfWidth);
  flow.lattice.initialise((i, j) => {
    const x = i - flow.centreX;
    const y = j - flow.centreY;
    if (Math.hypot(x, y) <= flow.radius) return [0, 0, 0];
    const [u, v] = flow.farField(i, j);
    // A kick across the stream behind the cylinder, so that shedding does not wait for rounding errors.
    const kick = 0.3 * SPEED * Math.exp(-(((x - 1.5 * cells) / cells) ** 2) - (y / cells) ** 2);
    return [u, v + kick, 0];
  });
  const record = emptyRecord();
  const slice = Math.round(10 * convective(cells));
  for (let done = 0; done < time; done += 10) {
    run(flow, slice, record);
    say(
      `coarse, ${cells} cells, ${2 * halfWidth} D wide: time ${done + 10}, ${record.crossings.length} crossings, lift ${record.lift.toFixed(3)}`,
    );
  }
  return { flow, result: strouhalOf(record, cells, cycles) };
}

const time = trial ? 60 : 120;
const HALF_WIDTH = 8;
const WIDE_HALF_WIDTH = 14;
const coarseCells = 16;
const fineCells = 32;

const narrow = coarse(coarseCells, HALF_WIDTH, time, 8);
say(`coarse narrow ${JSON.stringify(narrow.result)}`);

const fine = makeCase(fineCells, HALF_WIDTH);
{
  const moments = new Float64Array(3);
  const ratio = coarseCells / fineCells;
  const { lattice } = narrow.flow;
  fine.lattice.initialise((i, j) => {
    if (Math.hypot(i - fine.centreX, j - fine.centreY) <= fine.radius) return [0, 0, 0];
    const x = Math.min(i * ratio, lattice.width - 1.001);
    const y = Math.min(j * ratio, lattice.height - 1.001);
    const i0 = Math.floor(x);
    const j0 = Math.floor(y);
    const sum = [0, 0, 0];
    let weights = 0;
    for (const [di, dj] of [
      [0, 0],
      [1, 0],
      [0, 1],
      [1, 1],
    ]) {
      const inside = Math.hypot(i0 + di - narrow.flow.centreX, j0 + dj - narrow.flow.centreY) <= narrow.flow.radius;
      const weight = Math.abs(1 - di - (x - i0)) * Math.abs(1 - dj - (y - j0));
      if (inside) continue;
      lattice.momentsInto(i0 + di, j0 + dj, moments);
      for (let k = 0; k < 3; k++) sum[k] += weight * moments[k];
      weights += weight;
    }
    return weights === 0 ? [0, 0, 0] : [sum[0] / weights, sum[1] / weights, sum[2] / weights];
  });
}
const record = emptyRecord();
const untilCrossing = () => {
  const before = record.crossings.length;
  while (record.crossings.length === before) run(fine, 1, record);
};
const settle = trial ? 1 : 5;
for (let k = 0; k < settle; k++) {
  untilCrossing();
  say(`fine: settling, step ${record.steps}`);
}
const settled = record.crossings.length;
const firstCycles = trial ? 2 : 6;
for (let k = 0; k < firstCycles; k++) {
  untilCrossing();
  say(`fine: measuring, step ${record.steps}`);
}
const period = strouhalOf(record, fineCells, firstCycles).period;

// Phase resolution: sums over whole cycles against cos and sin of each harmonic, phase 0 at the last crossing.
const sampleCycles = trial ? 2 : 8;
const stride = 24;
const samples = Math.round((sampleCycles * period) / stride);
const fineLeft = Math.round(STORED.left * fineCells);
const fineRight = Math.round(STORED.right * fineCells);
const fineTop = Math.round(STORED.top * fineCells);
const across = fineRight - fineLeft + 1;
const rows = 2 * fineTop + 1;
const terms = 1 + 2 * STORED.harmonics;
const sums = Array.from({ length: 2 * terms }, () => new Float64Array(across * rows));
const startStep = record.crossings[record.crossings.length - 1];
const moments = new Float64Array(3);
const basis = new Float64Array(terms);
for (let n = 0; n < samples; n++) {
  const phase = (2 * Math.PI * sampleCycles * (record.steps - startStep)) / (samples * stride);
  basis[0] = 1 / samples;
  for (let h = 1; h <= STORED.harmonics; h++) {
    basis[2 * h - 1] = (2 / samples) * Math.cos(h * phase);
    basis[2 * h] = (2 / samples) * Math.sin(h * phase);
  }
  for (let j = 0; j < rows; j++) {
    for (let i = 0; i < across; i++) {
      fine.lattice.momentsInto(i + fineLeft + fine.centreX, j - fineTop + fine.centreY, moments);
      const at = j * across + i;
      for (let k = 0; k < terms; k++) {
        sums[2 * k][at] += (basis[k] * moments[0]) / SPEED;
        sums[2 * k + 1][at] += (basis[k] * moments[1]) / SPEED;
      }
    }
  }
  run(fine, stride, record);
  if (n % 100 === 99) say(`fine: resolving phases, sample ${n + 1} of ${samples}`);
}
const cyclesMeasured = record.crossings.length - settled;
const result = strouhalOf(record, fineCells, cyclesMeasured);
say(`fine ${JSON.stringify(result)}`);

// The periodic wake is its own mirror image half a period later: u_k(x, -y) = (-1)^k u_k(x, y), v_k with the other
// sign. The mean of both is stored, half of the plane; what they differ by is a measure of the state reached.
let mismatch = 0;
let total = 0;
for (let k = 0; k < terms; k++) {
  const even = Math.ceil(k / 2) % 2 === 0 ? 1 : -1;
  for (const [component, sign] of [
    [0, even],
    [1, -even],
  ]) {
    const field = sums[2 * k + component];
    for (let j = 0; j <= fineTop; j++) {
      for (let i = 0; i < across; i++) {
        const up = (fineTop + j) * across + i;
        const down = (fineTop - j) * across + i;
        const mean = 0.5 * (field[up] + sign * field[down]);
        mismatch += (field[up] - mean) ** 2;
        total++;
        field[up] = mean;
        field[down] = sign * mean;
      }
    }
  }
}
const asymmetry = Math.sqrt((mismatch * terms) / total);
say(`rms departure from the wake's own symmetry: ${asymmetry.toExponential(2)} of the stream`);

/** Value of a field between cells, bilinear; the four cells round the place must lie in the fluid. */
function between(field, x, y) {
  const i = Math.floor(x - fineLeft);
  const j = Math.floor(y + fineTop);
  const right = x - fineLeft - i;
  const up = y + fineTop - j;
  const at = j * across + i;
  return (
    (1 - up) * ((1 - right) * field[at] + right * field[at + 1]) +
    up * ((1 - right) * field[at + across] + right * field[at + across + 1])
  );
}

/** Depth in cells from which all four cells round a place lie in the fluid: the diagonal of one, and some. */
const CLEAR = 1.5;

/** Radial and tangential velocity of one term at `depth` cells outside the surface, towards (c, s). */
function nearWall(k, depth, c, s) {
  const polar = (d) => {
    const r = fine.radius + d;
    const u = between(sums[2 * k], r * c, r * s);
    const v = between(sums[2 * k + 1], r * c, r * s);
    return [c * u + s * v, c * v - s * u];
  };
  if (depth >= CLEAR) return polar(depth);
  // Nearer than that, what no slip and continuity leave: tangential a d + b d^2, radial c d^2.
  const [radial, near] = polar(CLEAR);
  const [, far] = polar(2 * CLEAR);
  const b = (far - 2 * near) / (2 * CLEAR * CLEAR);
  const a = near / CLEAR - b * CLEAR;
  return [radial * (depth / CLEAR) ** 2, (a + b * depth) * depth];
}

// Within the body the field is continued so that it stays smooth through the surface: the tangential velocity odd in
// the depth, the radial one even (it starts with the square of the depth), both faded to zero towards the centre.
const step = fineCells / STORED.perDiameter;
const storedAcross = Math.round((STORED.right - STORED.left) * STORED.perDiameter) + 1;
const storedRows = Math.round(STORED.top * STORED.perDiameter) + 1;
const stored = Array.from({ length: 2 * terms }, () => new Float64Array(storedAcross * storedRows));
for (let j = 0; j < storedRows; j++) {
  for (let i = 0; i < storedAcross; i++) {
    const x = i * step + fineLeft;
    const y = j * step;
    const r = Math.hypot(x, y);
    const at = j * storedAcross + i;
    for (let k = 0; k < terms; k++) {
      if (r > fine.radius) {
        const from = Math.round(y + fineTop) * across + Math.round(x - fineLeft);
        stored[2 * k][at] = sums[2 * k][from];
        stored[2 * k + 1][at] = sums[2 * k + 1][from];
        continue;
      }
      if (r === 0) continue;
      const c = x / r;
      const s = y / r;
      const [radial, tangential] = nearWall(k, fine.radius - r, c, s);
      const share = Math.min(1, (2 * r) / fine.radius);
      const fade = share * share * (3 - 2 * share);
      stored[2 * k][at] = fade * (c * radial + s * tangential);
      stored[2 * k + 1][at] = fade * (s * radial - c * tangential);
    }
  }
}

const wide = coarse(coarseCells, WIDE_HALF_WIDTH, time, 8);
say(`coarse wide ${JSON.stringify(wide.result)}`);

const meta = {
  what: 'wake of a circular cylinder at Reynolds number 150, resolved by phase of the shedding',
  command: 'npm run compile && node scripts/make-wake.mjs',
  reynolds: REYNOLDS,
  strouhal: result.strouhal,
  strouhalSpread: result.spread,
  cyclesMeasured: result.cycles,
  meanDragCoefficient: result.drag,
  rmsLiftCoefficient: result.liftRms,
  cellsPerDiameter: fineCells,
  machNumber: SPEED * Math.sqrt(3),
  domain: { upstream: UPSTREAM, downstream: DOWNSTREAM, width: 2 * HALF_WIDTH },
  blockage: 1 / (2 * HALF_WIDTH),
  coarse: {
    cellsPerDiameter: coarseCells,
    strouhal: narrow.result.strouhal,
    wideWidth: 2 * WIDE_HALF_WIDTH,
    wideStrouhal: wide.result.strouhal,
  },
  asymmetry,
  left: STORED.left,
  perDiameter: STORED.perDiameter,
  across: storedAcross,
  rows: storedRows,
  harmonics: STORED.harmonics,
};
const bytes = gzipSync(encodeWake(meta, stored), { level: 9 });
writeFileSync(out, bytes);
say(`${out}: ${bytes.length} bytes`);
say(JSON.stringify(meta, null, 1));
