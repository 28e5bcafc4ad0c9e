import { calibrationSummary } from '../detections/calibration-summary.js';
import { type RunRecord, SCHEMA_VERSION, type SystematicLine } from '../store/run-record.js';
import type { Board } from './board.js';

/** Share of samples set aside by screening above which a person should look (1 to 5 % is normal; common practice, no source). */
const MUCH_SET_ASIDE = 0.05;
/** Displacement ratio up to which linking was measured against truth (bench/results/linking.md); the first votes reach two spacings. */
const LARGE_RATIO = 1.5;

/** Links left out for their risk over links made above which results may be a selection (steady flows: below 0.03, measured). */
const MANY_LEFT_OUT = 0.2;

/** Tells what a person should look at in the finished run; to be called once, before `runRecord`. */
export function tellConcerns(board: Board): void {
  const finished = board.finished!;
  const { prior } = board.look!;
  const warn = (code: string, message: string, details: Readonly<Record<string, unknown>> = {}) =>
    board.context.event({ code, level: 'warning', message, details });
  const share = finished.samples > 0 ? 1 - finished.unflagged / finished.samples : 0;
  if (share > MUCH_SET_ASIDE) {
    const text = `${percent(share)} of the samples were set aside by screening (above ${percent(MUCH_SET_ASIDE)}): look at the recording; if the flow fluctuates from particle to particle, what was set aside may be turbulence, and stresses may come out too low`;
    warn('screening/much-set-aside', text, { share });
  }
  const ratio = prior.displacementRatio;
  if (ratio !== null && ratio > LARGE_RATIO) {
    const text = `displacement ratio ${ratio.toFixed(2)}: particles move much farther than they are apart; missing and wrong links are likely beyond 1.5, record at a higher rate or seed less`;
    warn('linking/large-ratio', text, { ratio });
  }
  const counts = board.linkCounts!;
  const leftOut = counts.leftOutForRisk;
  if (leftOut > MANY_LEFT_OUT * counts.links) {
    const text = `${leftOut} links were left out for their risk, ${counts.links} were made: the flow could not be followed everywhere, and what was followed may be a selection of it (layers that move differently, a flow that jumps, noise, too low a frame rate); look at the pathlines before any mean`;
    warn('linking/many-left-out', text, { leftOut, made: counts.links });
  }
  if (!prior.noiseMeasured && board.request.resolved.settings.clock.kind !== 'pairs') {
    warn(
      'noise/assumed',
      'position noise could not be measured from the first pathlines; standard errors rest on an assumed value',
    );
  }
}

/** run.json of a finished run, without its digest. Its times end here: what is left is to write it down. */
export function runRecord(board: Board): Omit<RunRecord, 'digest'> {
  const { request, tools, context } = board;
  const { settings, records, assumptions } = request.resolved;
  const scan = board.scan!;
  const finished = board.finished!;
  const calibration = board.calibration!;
  const { farAway } = board.farAway!;
  const links = board.linkCounts!;
  const grid = board.grid!;
  const { prior } = board.look!;
  const { frameNumbers } = scan;
  const summary = calibrationSummary(settings);
  const { length, time } = settings.units;
  const forLinking = calibration.detections - calibration.outsideRegion - calibration.insideBody - farAway;
  const pairs = settings.clock.kind === 'pairs';
  const inPathlines = pairs ? 2 * finished.samples : finished.samples;
  const filled = countFilled(grid.fields.get('u')?.values);
  const warnings = board.events.filter((event) => event.level === 'warning').map((event) => event.message);
  return {
    schema: SCHEMA_VERSION,
    program: { name: 'wakeloom', version: request.programVersion },
    run: settings.run,
    settings: records,
    assumptions: [...assumptions, ...summary.remarks, ...smoothingRemarks(board)],
    notes: settings.notes,
    inputs: scan.files,
    format: scan.format,
    columns: scan.columns,
    counts: {
      rowsPresent: scan.rowsPresent,
      rowsRead: scan.rowsRead,
      rowsSetAside: scan.setAside,
      framesSpanned: frameNumbers.length > 0 ? frameNumbers[frameNumbers.length - 1] - frameNumbers[0] + 1 : 0,
      framesPresent: frameNumbers.length,
      detections: calibration.detections,
      outsideRegion: calibration.outsideRegion,
      insideBody: calibration.insideBody,
      farAway,
      detectionsForLinking: forLinking,
      links: finished.links,
      linksBridging: finished.linksBridging,
      linksLeftOutForRisk: links.leftOutForRisk,
      pathlines: finished.pathlines,
      samples: finished.samples,
      shortFragments: finished.shortFragments,
      shortFragmentDetections: finished.shortFragmentDetections,
      unlinkedDetections: forLinking - inPathlines - finished.shortFragmentDetections,
      flagged: finished.flagged,
      samplesInGrid: board.samplesInGrid!,
      binsFilled: filled,
      bins: grid.samples.length,
    },
    // In the plane there is no third component to tell of.
    prior: { ...prior, noise: prior.noise.slice(0, scan.dims), reach: prior.reach.slice(0, scan.dims) },
    figures: {
      meanSpeed: finished.meanSpeed,
      peakSpeed: finished.peakSpeed,
      velocityUnit: `${length}/${time}`,
      lengthUnit: length,
      timeUnit: time,
      displacementRatio: prior.displacementRatio ?? Number.NaN,
      displacementRatio95: prior.displacementRatio95 ?? Number.NaN,
      medianPathlineSamples: finished.medianPathlineSamples,
      noise: prior.noise.slice(0, scan.dims),
      medianVelocitySe: finished.medianVelocitySe,
    },
    systematic: [...summary.systematic, ...smoothingLines(board)],
    warnings,
    verdict: null,
    clockTimes: { started: board.started.at, finished: tools.clock.now(), seconds: { ...board.seconds } },
    host: { ...tools.host, threads: context.budget.threads },
  };
}

/**
 * What the local fit takes from velocities that change within its span. It is no random error and does not stand in the
 * `_se` columns, though it grows with the acceleration's change from place to place: here its mean over the field.
 */
function smoothingLines(board: Board): SystematicLine[] {
  const { prior, smoothing } = board.look!;
  if (smoothing === null || !Number.isFinite(smoothing)) return [];
  const { units, smoothing: chosen } = board.request.resolved.settings;
  const { length, time } = units;
  const closed =
    chosen.order === 3
      ? ''
      : `; what is left of a motion that turns by theta a frame is sum(k sin(k theta)) / (theta sum(k^2)), k = -${(prior.span - 1) / 2} .. ${(prior.span - 1) / 2}`;
  return [
    {
      source: 'smoothing.span',
      standardUncertainty: smoothing,
      unit: `${length}/${time}`,
      effect: `smoothing: attenuation of velocity over the span of ${prior.span} frames, root mean square of one component forecast from the first pathlines; not in the _se columns, larger where the flow changes fast${closed}`,
    },
  ];
}

function smoothingRemarks(board: Board): string[] {
  if (board.look!.smoothing !== null || board.request.resolved.settings.clock.kind === 'pairs') return [];
  return [
    `How much the fit over ${board.look!.prior.span} frames smooths the velocities could not be forecast from the first pathlines; the standard errors do not hold it.`,
  ];
}

function countFilled(values: Float32Array | undefined): number {
  let filled = 0;
  for (const value of values ?? []) if (!Number.isNaN(value)) filled++;
  return filled;
}

function percent(share: number): string {
  return `${(100 * share).toFixed(1)} %`;
}
