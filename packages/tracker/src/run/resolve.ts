import { assumptionsOf } from './assumptions.js';
import { GivenSettings } from './given-settings.js';
import { quantityIn } from './parse-quantity.js';
import { resolveClock, resolveFluid } from './resolve-clock.js';
import { resolveBodies, resolveGeometry } from './resolve-geometry.js';
import { chooseUnits, itemsOf, type RunUnits, sizeIn, speedIn } from './resolve-units.js';
import type { OptionValue } from './setting-kinds.js';
import { settingRecords } from './setting-records.js';
import type { ColumnRef, DumpSettings, GridSettings, LinkingSettings, ResolvedRun, RunSettings } from './settings.js';
import type { ParsedSheet } from './sheet-form.js';

/** What a run is made from: a sheet, options by their name without dashes, files named beside them; any may be missing. */
export interface ResolveInput {
  readonly sheet?: ParsedSheet;
  readonly options?: Readonly<Record<string, OptionValue>>;
  /** Files of the dump given beside the options; they take the place of those in the sheet. */
  readonly dumpFiles?: readonly string[];
}

/**
 * Least working memory, bytes: half of it must hold a block of 40 000 detections with all columns of its fit (about
 * 250 bytes each, 10 MB) and its neighbours in time.
 */
const LEAST_RAM = 32e6;

/**
 * The name of a dump: that of its file without folders and without what follows its first dot; of a pattern, or of one
 * file a frame, that of the folder they lie in.
 */
function baseName(files: readonly string[], layout: DumpSettings['layout']): string {
  const parts = files[0]!.split(/[\\/]/);
  const file = parts.pop()!;
  const wild = /[*?]/.test(file);
  const folder = parts.filter((part) => !/^(|\.|\.\.)$|[*?]/.test(part)).pop();
  if (folder !== undefined && (wild || (files.length > 1 && layout !== 'one-file-a-run'))) return folder;
  return file.replace(/(?<=.)\..*$/, '').replace(/[*?]/g, '') || 'run';
}

function resolveDump(given: GivenSettings, dumpFiles: readonly string[] | undefined): DumpSettings {
  const column = (name: string) => given.value(`dump.columns.${name}`) as ColumnRef | 'auto';
  return {
    files: dumpFiles ?? (given.value('dump.files') as readonly string[] | null) ?? [],
    format: given.text('dump.format') as DumpSettings['format'],
    columns: {
      frame: column('frame'),
      x: column('x'),
      y: column('y'),
      z: column('z'),
      brightness: column('brightness'),
      pathline: column('pathline'),
      time: column('time'),
    },
    separator: given.text('dump.separator') as DumpSettings['separator'],
    decimal: given.text('dump.decimal') as DumpSettings['decimal'],
    header: given.text('dump.header') as DumpSettings['header'],
    layout: given.text('dump.layout') as DumpSettings['layout'],
    dataset: given.value('dump.dataset') as string | null,
    badRowsLimit: given.number('dump.bad-rows-limit'),
    given: given.text('dump.pathline-numbers') as DumpSettings['given'],
  };
}

function resolveLinking(given: GivenSettings, units: RunUnits): LinkingSettings {
  const reach = given.quantity('linking.reach');
  return {
    reach: reach === null ? 'auto' : sizeIn(given, units, 'linking.reach', reach),
    bridge: given.number('linking.bridge'),
    care: given.text('linking.care') as LinkingSettings['care'],
    shortest: given.number('linking.shortest'),
    search: given.text('linking.search') as LinkingSettings['search'],
    riskLimit: given.number('linking.risk-limit'),
    depthNoise: given.number('linking.depth-noise'),
  };
}

function resolveGrid(given: GivenSettings, units: RunUnits): GridSettings {
  const bin = given.vector('grid.bin');
  const sizes = bin === null ? [] : itemsOf(bin).map((item) => sizeIn(given, units, 'grid.bin', item));
  const [x = 0, y = x, z = x] = sizes;
  return {
    bin: bin === null ? 'auto' : [x, y, z],
    overlap: given.number('grid.overlap'),
    fewestForMean: given.number('grid.fewest-for-mean'),
    fewestForStress: given.number('grid.fewest-for-stress'),
  };
}

function resolveStream(given: GivenSettings, units: RunUnits): RunSettings['stream'] {
  const speed = given.quantity('stream.speed');
  if (speed === null) {
    if (given.has('stream.direction')) {
      given.problem('stream.direction', 'got a direction without a speed, expected stream.speed beside it');
    }
    return null;
  }
  const direction = given.value('stream.direction') as readonly [number, number, number];
  return { speed: speedIn(given, units, 'stream.speed', speed), direction };
}

function resolveTracers(given: GivenSettings): RunSettings['tracers'] {
  const diameter = given.quantity('tracers.diameter');
  const density = given.quantity('tracers.density');
  if (diameter === null && density === null) return null;
  if (diameter === null || density === null) {
    const [present, missing] = diameter === null ? ['density', 'diameter'] : ['diameter', 'density'];
    given.problem(`tracers.${present}`, `got tracers without their ${missing}, expected tracers.${missing} beside it`);
    return null;
  }
  const inMetres = given.attempt('tracers.diameter', diameter, () => quantityIn(diameter, 'm', 'length'));
  return { diameter: inMetres, density: quantityIn(density, 'kg/m3', 'density') };
}

/**
 * The settings of a run: an option overrules the sheet, the sheet overrules the default, and the origin of each
 * stands in `records`. Lengths come out in the unit of the scale (`mm/px` gives mm), times in s; without a scale or a
 * clock in px and frames, which `assumptions` says in plain sentences. A reach or bin in px is taken through the
 * scale.
 *
 * All problems are reported at once, each as `where: got X, expected Y`, also in `details.problems`. Codes:
 * `sheet/invalid` when all of them stand in the sheet, else `usage/settings`.
 *
 * @example
 * const { settings } = resolveRun({
 *   options: { rate: '500 Hz', scale: '0.05 mm/px', bin: '2 mm' },
 *   dumpFiles: ['run-07.csv'],
 * });
 * settings.grid.bin; // [2, 2, 2]
 */
export function resolveRun(input: ResolveInput): ResolvedRun {
  const given = new GivenSettings(input.sheet, input.options ?? {});
  const units = chooseUnits(given);
  const dump = resolveDump(given, input.dumpFiles);
  const clock = resolveClock(given);
  const ramLimit = given.quantity('results.ram-limit');
  const settings: RunSettings = {
    run: (given.value('run') as string | null) ?? (dump.files.length > 0 ? baseName(dump.files, dump.layout) : 'run'),
    dump: { ...dump, timesAreClock: clock.kind === 'times' },
    clock,
    geometry: resolveGeometry(given, units),
    fluid: resolveFluid(given),
    stream: resolveStream(given, units),
    body: resolveBodies(given, units),
    tracers: resolveTracers(given),
    linking: resolveLinking(given, units),
    smoothing: {
      span: given.value('smoothing.span') as number | 'auto',
      order: given.number('smoothing.order') as 1 | 2 | 3,
    },
    screening: {
      medianThreshold: given.number('screening.median-threshold'),
      medianNeighbours: given.number('screening.median-neighbours'),
      stuckFactor: given.number('screening.stuck-factor'),
    },
    grid: resolveGrid(given, units),
    results: {
      keepPathlines: given.text('results.keep-pathlines') as RunSettings['results']['keepPathlines'],
      keepFrames: given.text('results.keep-frames') as RunSettings['results']['keepFrames'],
      ramLimit: ramLimit === null ? Number.NaN : quantityIn(ramLimit, 'B', 'bytes').value,
      threads: given.number('results.threads'),
    },
    notes: (given.value('notes') as Readonly<Record<string, string>> | null) ?? {},
    seed: given.number('seed'),
    units: { length: units.length, time: units.time },
  };
  const { ramLimit: bytes } = settings.results;
  if (bytes < LEAST_RAM) {
    given.problem(
      'results.ram-limit',
      `got ${bytes / 1e6} MB, expected at least ${LEAST_RAM / 1e6} MB: half of it holds the frames being fitted, half the rows being put in order; the program itself takes about 180 MB beside it`,
    );
  }
  const { span, order } = settings.smoothing;
  if (span !== 'auto' && span !== null && span <= order) {
    given.problem('smoothing.span', `got ${span} frames, expected more than the order ${order} of the polynomial`);
  }
  given.settle();
  return { settings, records: settingRecords(given), assumptions: assumptionsOf(settings, given) };
}
