import { met, speedLine } from './print.mjs';

/** Fewer errors of the oracle than this are no measure. */
const FEW = 10;
const RATIO_ORDER = (a, b) => a - b;

/** Everything that was measured, for bench/results/linking.md. `heldOut` may be null. */
export function fullTable(full, heldOut) {
  const parts = [
    '# Links against known truth',
    `Made from ${full.file}${heldOut === null ? '' : ` and ${heldOut.file}`} by \`npm run bench:linking\`; do not edit.
${provenance(full)}`,
    HOW_TO_READ,
    `## ${USUAL_WORDS}`,
    scoreTable(full.cases.filter(isUsual)),
    '## Image pairs, ratio 0.6, 100 pairs',
    scoreTable(full.cases.filter((one) => one.case.pairs)),
    '## One thing changed at a time',
    'Precision / recall, one seed. No bars stand for these.',
    ...changedTables(full.cases.filter((one) => one.unusual !== '' && !one.case.pairs)),
    '## Link risk',
    'All links of all dumps above, by the risk that was stated for them. A decade is judged where at least 100 wrong links are to be expected.',
    riskTable(full.risk),
  ];
  parts.push(`${speedLine(full)}; two processes at once.`);
  if (heldOut !== null) {
    parts.push(
      '## Seeds set aside',
      `Looked at once. ${provenance(heldOut)}`,
      scoreTable(heldOut.cases),
      riskTable(heldOut.risk),
    );
  }
  parts.push(
    '## The flows',
    table(
      ['flow', 'view and parameters'],
      full.flows.map(({ name, why }) => [name, why]),
    ),
  );
  if (full.failed.length > 0) parts.push('## Failed', ...full.failed.map(({ error }) => `\`\`\`\n${error}\n\`\`\``));
  return `${parts.join('\n\n')}\n`;
}

/** One row a flow, one column a ratio, for the README. */
export function compactTable(full) {
  const usual = full.cases.filter(isUsual);
  const ratios = [...new Set(usual.map((one) => one.case.ratio))].sort(RATIO_ORDER);
  const rows = grouped(usual, (one) => one.case.flow).map(([flow, ofFlow]) => [
    flow,
    ...ratios.map((ratio) => {
      const cases = ofFlow.filter((one) => one.case.ratio === ratio);
      return cases.length === 0 ? '' : `${worst(cases, 'ours')}${cases.every(met) ? '' : ' **missed**'}`;
    }),
  ]);
  const missed = missedOf(full.cases);
  return [
    `Precision / recall by flow and displacement ratio; ${USUAL_WORDS}; the worse of the seeds. ${
      missed === 0 ? 'All bars met.' : `${missed} of ${barred(full.cases).length} bars missed.`
    } Link risk: ${full.risk.misses.length === 0 ? 'all bars met' : `${full.risk.misses.length} of its bars missed`}. All of it, with the bars, the linker that is told the flow and plain nearest neighbour: \`bench/results/linking.md\`, made from ${full.file}.`,
    table(['flow', ...ratios.map(String)], rows),
  ].join('\n\n');
}

const USUAL_WORDS = '4000 particles a frame, 60 frames, 5 % lost, 5 % false, noise 0.1 px, default settings';

const HOW_TO_READ = `Precision: right links over links made. Recall: right links over true links. A true link joins two successive
detections of one particle, at most three frames apart, of particles with at least three detections so joined; pathlines
of fewer than three do not count (image pairs: two). Errors: wrong and missed links per true link. The oracle is told the
true flow and carries each pathline's last detection with it; same assignment, gate and bridge. Nearest: the nearest
detection within half a spacing of the last. Each row gives the worse of its seeds in each figure; nothing was told to
our linker that the dump does not hold, and the settings are the same for all. Times: our errors over the oracle's, all
seeds together.`;

function provenance({ date, commit, changed, machine, set, seconds }) {
  return `${date}, commit ${commit}${changed ? ' with changes' : ''}, \`--set ${set}\`, ${seconds} s on ${machine.processor}, ${machine.cores} cores, ${machine.memoryGigabytes} GB, ${machine.platform}, Node ${machine.node}.`;
}

function isUsual(one) {
  return one.unusual === '';
}

function barred(cases) {
  return grouped(cases, (one) => `${one.case.flow} ${one.case.ratio} ${one.case.pairs}`).filter(
    ([, same]) => same[0].bar.must !== null,
  );
}

function missedOf(cases) {
  return barred(cases).filter(([, same]) => !same.every(met)).length;
}

/** One row a flow and ratio. */
function scoreTable(cases) {
  const rows = grouped(cases, (one) => `${one.case.pairs} ${one.case.flow} ${one.case.ratio}`).map(([, same]) => {
    const { bar, case: first } = same[0];
    const { must, timesOracle: aimed, aim } = bar;
    const errors = (who) => Math.max(...same.map((one) => one[who].errors)).toExponential(1);
    const wrongBy = (who) => same.reduce((sum, one) => sum + one[who].errors * one[who].true, 0);
    const times = wrongBy('oracle') < FEW ? null : wrongBy('ours') / wrongBy('oracle');
    return [
      `${first.flow}${first.pairs ? ', pairs' : ''}`,
      first.ratio,
      worst(same, 'ours'),
      must === null ? '' : `${must.precision} / ${must.recall} ${same.every(met) ? 'met' : '**missed**'}`,
      errors('ours'),
      errors('oracle'),
      times === null ? '' : times.toFixed(1),
      aimWords(same, aimed, times, aim),
      worst(same, 'nearest'),
      same.length,
    ];
  });
  return table(
    ['flow', 'ratio', 'precision / recall', 'must', 'errors', "oracle's", 'times', 'aim', 'nearest', 'seeds'],
    rows,
  );
}

function aimWords(same, aimed, times, aim) {
  if (aim !== null) {
    const reached = same.every(({ ours }) => ours.precision >= aim.precision && ours.recall >= aim.recall);
    return `${aim.precision} / ${aim.recall} ${reached ? 'reached' : 'not reached'}`;
  }
  if (aimed === null) return '';
  if (times === null) return `${aimed} times; the oracle makes none to speak of`;
  return `${aimed} times ${times <= aimed ? 'reached' : 'not reached'}`;
}

/** One table a ratio: one row a change, one column a flow. */
function changedTables(cases) {
  return grouped(cases, (one) => one.case.ratio).flatMap(([ratio, same]) => {
    const flows = [...new Set(same.map((one) => one.case.flow))];
    const rows = grouped(same, (one) => one.unusual).map(([what, ofChange]) => [
      what,
      ...flows.map((flow) => {
        const of = ofChange.filter((one) => one.case.flow === flow);
        return of.length === 0 ? '' : worst(of, 'ours');
      }),
    ]);
    return [`Ratio ${ratio}:`, table(['', ...flows], rows)];
  });
}

function riskTable({ decades, areaUnderCurve, expected, wrong, misses }) {
  const rows = decades.map(({ from, to, links, verdict, ...decade }) => [
    `${from.toExponential(0)} to ${to.toExponential(0)}`,
    links,
    decade.expected.toFixed(1),
    decade.wrong,
    decade.expected > 0 ? (decade.wrong / decade.expected).toFixed(2) : '',
    verdict === 'missed' ? '**missed**' : verdict,
  ]);
  const verdict = misses.length === 0 ? 'All bars met.' : `**Missed**: ${misses.join('; ')}.`;
  return `${table(['stated risk', 'links', 'expected wrong', 'observed wrong', 'observed / stated', '0.67 to 1.5'], rows)}

Area under the curve ${areaUnderCurve.toFixed(3)} (at least 0.9). Sum of risks over wrong links ${(expected / wrong).toFixed(3)} (0.85 to 1.15). ${verdict}`;
}

/** Least precision and least recall. */
function worst(cases, who) {
  const least = (name) => Math.min(...cases.map((one) => one[who][name])).toFixed(4);
  return `${least('precision')} / ${least('recall')}`;
}

function grouped(items, keyOf) {
  const groups = new Map();
  for (const item of items) {
    const key = keyOf(item);
    if (groups.has(key)) groups.get(key).push(item);
    else groups.set(key, [item]);
  }
  return [...groups];
}

function table(head, rows) {
  const line = (cells) => `| ${cells.join(' | ')} |`;
  return [line(head), line(head.map(() => '---')), ...rows.map(line)].join('\n');
}
