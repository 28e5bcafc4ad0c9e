/** Precision and recall as `0.9987/0.9865`. */
export function share({ precision, recall }) {
  return `${precision.toFixed(4)}/${recall.toFixed(4)}`;
}

/** Whether precision and recall reach what must be reached; true where nothing must. */
export function met({ ours, bar }) {
  return bar.must === null || (ours.precision >= bar.must.precision && ours.recall >= bar.must.recall);
}

/** Our errors over the oracle's, or a word where it made too few to compare with. */
export function timesOracle({ ours, oracle }) {
  return oracle.errors * oracle.true < 10 ? 'few' : (ours.errors / oracle.errors).toFixed(1);
}

/** One case in one line. */
export function scoreLine(name, one) {
  const { ours, oracle, nearest, linkSeconds, truthSeconds } = one;
  return [
    name.padEnd(34),
    `ours ${share(ours)}${met(one) ? '  ' : ' x'}`,
    `oracle ${share(oracle)} `,
    `nearest ${share(nearest)} `,
    `errors ${ours.errors.toExponential(1)} / ${oracle.errors.toExponential(1)} = ${timesOracle(one).padStart(5)} `,
    `${linkSeconds.toFixed(1)} s (truth ${truthSeconds.toFixed(1)} s)`,
  ].join(' ');
}

/** Links by their stated risk. */
export function riskLines({ decades, areaUnderCurve, expected, wrong, misses }) {
  const lines = ['', 'stated risk          links   expected wrong   observed wrong   observed / expected'];
  for (const decade of decades) {
    const range = `${decade.from.toExponential(0)} .. ${decade.to.toExponential(0)}`;
    const ratio = decade.expected > 0 ? (decade.wrong / decade.expected).toFixed(2) : '';
    lines.push(
      `${range.padEnd(14)} ${String(decade.links).padStart(11)} ${decade.expected.toFixed(1).padStart(16)} ${String(decade.wrong).padStart(16)} ${ratio.padStart(12)}`,
    );
  }
  lines.push(
    `sum of risks / wrong links ${(expected / wrong).toFixed(3)}; area under the curve ${areaUnderCurve.toFixed(4)}`,
  );
  lines.push(misses.length === 0 ? 'link risk: all bars met' : `link risk misses: ${misses.join('; ')}`);
  return lines;
}

/** Rate of first look and linking over the cases: median and spread. Two processes share the machine. */
export function speedLine({ cases, seconds }) {
  const rates = cases.map(({ detections, linkSeconds }) => detections / linkSeconds / 1000).sort((a, b) => a - b);
  const at = (part) => rates[Math.min(rates.length - 1, Math.floor(part * rates.length))].toFixed(0);
  return `First look and linking: median ${at(0.5)} thousand detections/s a process (${at(0.1)} to ${at(0.9)} for the middle eight tenths), ${seconds} s in all`;
}
