/**
 * Times `call`, which resolves to the seconds that count (so that preparing is left out), after one call to warm up: the
 * median of `runs`, and the largest minus the smallest over the median.
 */
export async function timed(runs, call) {
  await call();
  const seconds = [];
  for (let run = 0; run < runs; run++) seconds.push(await call());
  seconds.sort((a, b) => a - b);
  const medianSeconds = seconds[runs >> 1];
  return { medianSeconds, spread: (seconds[runs - 1] - seconds[0]) / medianSeconds };
}

/** Seconds that `work` takes. */
export async function seconds(work) {
  const start = performance.now();
  await work();
  return (performance.now() - start) / 1000;
}

/** `1.20 million samples/s` and the like. */
export function rate(count, medianSeconds, unit) {
  const perSecond = count / medianSeconds;
  return `${(perSecond / 1e6).toPrecision(3)} million ${unit}/s`;
}

/** Throws unless the answer is right: nothing is timed that is wrong. */
export function check(right, what) {
  if (!right) throw new Error(`wrong answer: ${what}`);
}

/** Prints the rows of a case that is run alone. */
export function print(rows) {
  for (const row of rows) {
    const peak = row.peakMegabytes === undefined ? '' : `  ${row.peakMegabytes} MB resident at most`;
    const spread = row.spread === null ? 'once' : `spread ${Math.round(row.spread * 100)} %`;
    console.log(
      `${row.name.padEnd(64)} ${row.medianSeconds.toFixed(3).padStart(8)} s  ${spread.padStart(12)}  ${row.rate}${peak}`,
    );
    if (row.note) console.log(`    ${row.note}`);
  }
}
