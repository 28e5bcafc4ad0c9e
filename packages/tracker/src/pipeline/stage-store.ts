import { WakeloomError } from '../core/errors.js';
import { createGridAccumulator } from '../eulerian/accumulate.js';
import { gridShape, withoutNoise } from '../eulerian/grid-shape.js';
import { reportHtml } from '../figures/report.js';
import { openResultWriter } from '../store/result-writer.js';
import type { Stage } from './board.js';
import { runRecord, tellConcerns } from './run-record.js';

/** Pathlines longer than this share the last bar of the length histogram. */
const LONGEST_BAR = 100_000;

/**
 * Fewest samples of a pathline that is called stuck: with fewer, slow particles of a recirculation would be taken for
 * dirt on a window and bias its mean (dirt stays for the whole recording; common practice, no source).
 */
const FEWEST_STUCK = 20;

/**
 * Draws the samples through the stages before, spills them, turns them into pathline order, bins them on the way,
 * and completes the result folder. Whatever fails leaves the folder as it was.
 */
export const storeStage: Stage = {
  name: 'store',
  needs: ['scan', 'look', 'calibration', 'farAway', 'linkCounts', 'samples', 'extent'],
  gives: ['finished', 'grid', 'samplesInGrid', 'pathlinesBySamples', 'record'],
  timed: false,
  async run(board) {
    const { context, tools, request, seconds } = board;
    const { settings } = request.resolved;
    const { dims, rowsRead, frameNumbers, frameCounts } = board.scan!;
    const { prior } = board.look!;
    const pairs = settings.clock.kind === 'pairs';
    const writer = openResultWriter(tools.place, {
      dims,
      pairs,
      units: settings.units,
      shortest: pairs ? 1 : settings.linking.shortest,
      bridge: settings.linking.bridge,
      keepPathlines: settings.results.keepPathlines,
      keepFrames: settings.results.keepFrames,
      stuckFactor: settings.screening.stuckFactor,
      stuckFewest: Math.max(settings.linking.shortest, FEWEST_STUCK),
      noise: prior.noise,
      frameStep: prior.frameStep,
      ramLimit: settings.results.ramLimit,
      context,
      title: settings.run,
      expectedSamples: rowsRead,
    });
    try {
      const streamed = tools.clock.seconds();
      for await (const block of board.samples!) await writer.add(block);
      seconds['stream'] = tools.clock.seconds() - streamed;
      // A stream that has ended still holds what it worked with: the linker's and the fit's columns.
      delete board.detections;
      delete board.linked;
      delete board.samples;
      if (board.extent!.samples === 0) throw nothingLinked();
      const { detections } = board.calibration!;
      context.event({
        code: 'run/streamed',
        level: 'info',
        message: `${detections} detections, ${board.linkCounts!.links} links, ${board.extent!.samples} samples`,
        details: { detections, ...board.linkCounts!, samples: board.extent!.samples },
      });
      const { trusted, all } = board.extent!;
      const { bounds, tolerance } = withoutNoise(trusted.min[0] <= trusted.max[0] ? trusted : all, prior.noise);
      const shape = gridShape(settings.grid, dims, bounds, prior.spacing, frameNumbers.length);
      const bins = createGridAccumulator(shape, dims, {
        fewestForMean: settings.grid.fewestForMean,
        fewestForStress: settings.grid.fewestForStress,
        lengthUnit: settings.units.length,
        timeUnit: settings.units.time,
        tolerance,
      });
      const bySamples = new Float64Array(LONGEST_BAR);
      let longest = 0;
      const written = tools.clock.seconds();
      const finished = await writer.finish((rows) => {
        bins.add({ ...rows, rowStart: rows.offsets });
        for (let k = 0; k + 1 < rows.offsets.length; k++) {
          const length = Math.min(rows.offsets[k + 1] - rows.offsets[k], LONGEST_BAR - 1);
          bySamples[length]++;
          if (length > longest) longest = length;
        }
      });
      board.finished = finished;
      board.pathlinesBySamples = bySamples.slice(0, longest + 1);
      board.grid = bins.finish();
      board.samplesInGrid = bins.taken;
      await writer.writeGrid(board.grid, {});
      if (finished.pathlines === 0) throw nothingLinked();
      seconds['write'] = tools.clock.seconds() - written;
      context.event({
        code: 'run/written',
        level: 'info',
        message: `${finished.pathlines} pathlines, ${finished.samples} samples, ${shape.count.join(' x ')} bins`,
        details: { pathlines: finished.pathlines, samples: finished.samples, bins: shape.count },
      });
      tellConcerns(board);
      seconds['total'] = tools.clock.seconds() - board.started.seconds;
      context.event({
        code: 'run/finished',
        level: 'info',
        message: `done after ${seconds['total'].toFixed(2)} s`,
        details: { seconds },
      });
      const record = runRecord(board);
      const data = {
        grid: board.grid,
        bodies: settings.body,
        detectionsPerFrame: { frame: frameNumbers, detections: frameCounts },
        pathlinesBySamples: board.pathlinesBySamples,
      };
      const log = board.events.map((event) => JSON.stringify(event));
      board.record = await writer.complete(record, (full) => reportHtml(full, data), log);
    } catch (error) {
      writer.abandon();
      throw error;
    }
  },
};

function nothingLinked(): WakeloomError {
  return new WakeloomError(
    'linking/no-pathlines',
    'linking: got no pathline of the shortest length kept, expected some; check the frame column, the rate and the scale; where particles move by more than two spacings a frame set --reach by hand; two-frame recordings need --pair-delay; see --shortest and --risk-limit too',
  );
}
