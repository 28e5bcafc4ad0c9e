// Links dumps with known truth and scores the links, beside a linker that is told the flow and plain nearest neighbour:
//   node bench/linking/run.mjs --flows street,random --ratios 1 --seeds 1
// Reads the sources of the library, no build needed. One line a case, then the links by their stated risk.
import { rmSync } from 'node:fs';
import { join } from 'node:path';
import { parseArgs } from 'node:util';
import { bundleHarness, ROOT, SCRATCH } from './bundle.mjs';
import { runCases } from './run-cases.mjs';

const text = { type: 'string' };
const { values } = parseArgs({
  options: {
    flows: text,
    ratios: text,
    seeds: text,
    noise: text,
    losses: text,
    ghosts: text,
    particles: text,
    frames: text,
    care: text,
    pairs: { type: 'boolean' },
    workers: text,
    'no-cache': { type: 'boolean' },
  },
});

const list = (value, otherwise) => (value === undefined ? otherwise : value.split(','));
const numbers = (value, otherwise) => list(value, otherwise).map(Number);

const { folder, address } = await bundleHarness();
const harness = await import(address);
const { USUAL } = harness;
const cases = [];
for (const flow of list(values.flows, harness.ALL_FLOWS)) {
  for (const ratio of numbers(values.ratios, [0.3, 0.6, 1])) {
    for (const noise of numbers(values.noise, [USUAL.noise])) {
      for (const losses of numbers(values.losses, [USUAL.losses])) {
        for (const ghosts of numbers(values.ghosts, [USUAL.ghosts])) {
          for (const perFrame of numbers(values.particles, [USUAL.perFrame])) {
            for (const frames of numbers(values.frames, [USUAL.frames])) {
              for (const seed of numbers(values.seeds, [1])) {
                for (const care of list(values.care, [USUAL.care])) {
                  cases.push({
                    flow,
                    ratio,
                    noise,
                    losses,
                    ghosts,
                    perFrame,
                    frames,
                    seed,
                    pairs: values.pairs ?? false,
                    care,
                  });
                }
              }
            }
          }
        }
      }
    }
  }
}

const places = { root: ROOT, cache: values['no-cache'] ? null : join(SCRATCH, 'truth') };
const started = performance.now();
const pool = harness.emptyPool();
const share = ({ precision, recall }) => `${precision.toFixed(4)}/${recall.toFixed(4)}`;
await runCases(cases, {
  address,
  places,
  workers: Number(values.workers ?? 2),
  onCase(index, { result, error }) {
    const name = harness.caseName(cases[index]).padEnd(40);
    if (error !== undefined) return console.log(`${name} FAILED: ${error}`);
    const { ours, oracle, nearest } = result;
    harness.addPool(pool, result.risk);
    console.log(
      `${name} ours ${share(ours)}  oracle ${share(oracle)}  nearest ${share(nearest)}  errors ${ours.errors.toExponential(1)} / ${oracle.errors.toExponential(1)} = ${(ours.errors / oracle.errors).toFixed(1).padStart(6)}  ${result.linkSeconds.toFixed(1)} s (truth ${result.truthSeconds.toFixed(1)} s)`,
    );
  },
});
const { decades, areaUnderCurve, expected, wrong } = harness.summarise(pool);
console.log('\nstated risk          links   expected wrong   observed wrong   observed / expected');
for (const decade of decades) {
  const range = `${decade.from.toExponential(0)} .. ${decade.to.toExponential(0)}`;
  console.log(
    `${range.padEnd(14)} ${String(decade.links).padStart(11)} ${decade.expected.toFixed(1).padStart(16)} ${String(decade.wrong).padStart(16)} ${(decade.wrong / decade.expected).toFixed(2).padStart(12)}`,
  );
}
console.log(
  `sum of risks / wrong links ${(expected / wrong).toFixed(3)}; area under the curve ${areaUnderCurve.toFixed(4)}; ${((performance.now() - started) / 1000).toFixed(0)} s`,
);
rmSync(folder, { recursive: true, force: true });
