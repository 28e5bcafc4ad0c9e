import { WakeloomError } from '../core/errors.js';
import type { Growable } from './growable.js';

/** Which provisional pathlines are kept, under which final number, and where their rows lie. */
export interface Numbering {
  /** Final number of each provisional pathline, -1 when dropped. [provisional] */
  readonly final: Int32Array;
  /** Row of the next sample of each provisional pathline: the first at the start; whoever walks samples moves it. [provisional] */
  readonly next: Int32Array;
  readonly pathlines: number;
  readonly samples: number;
  /** Pathlines of two or more samples, but fewer than `shortest`, and the detections in them. */
  readonly shortFragments: number;
  readonly shortFragmentDetections: number;
  readonly medianSamples: number;
}

/** Rows are numbered in 32 bits in the files. */
const MOST_ROWS = 2 ** 31 - 1;

/**
 * Final numbers 0, 1, ... in the order of the provisional ones, which ascend with the first frame; pathlines with
 * fewer than `shortest` samples are dropped. Code `store/too-many-samples` beyond 2^31 - 1.
 */
export function numberPathlines(counts: Growable<Int32Array>, shortest: number): Numbering {
  const final = new Int32Array(counts.length);
  const next = new Int32Array(counts.length);
  let pathlines = 0;
  let samples = 0;
  let shortFragments = 0;
  let shortFragmentDetections = 0;
  for (let p = 0; p < counts.length; p++) {
    const count = counts.array[p];
    final[p] = -1;
    if (count === 0) continue;
    if (count < shortest) {
      // A detection that nothing was linked to is no fragment.
      if (count === 1) continue;
      shortFragments++;
      shortFragmentDetections += count;
      continue;
    }
    final[p] = pathlines++;
    next[p] = samples;
    samples += count;
    if (samples > MOST_ROWS) {
      throw new WakeloomError(
        'store/too-many-samples',
        `samples: got more than ${MOST_ROWS}, expected at most that many in one result folder; process the dump in parts`,
        { most: MOST_ROWS },
      );
    }
  }
  const medianSamples = medianCount(counts, final, pathlines);
  return { final, next, pathlines, samples, shortFragments, shortFragmentDetections, medianSamples };
}

/** Puts `next` back to the first rows after all samples were walked. */
export function rewind(numbering: Numbering, counts: Growable<Int32Array>): void {
  for (let p = 0; p < numbering.next.length; p++) if (numbering.final[p] >= 0) numbering.next[p] -= counts.array[p];
}

/** Median samples a kept pathline, the mean of the middle two for an even number; NaN without pathlines. */
function medianCount(counts: Growable<Int32Array>, final: Int32Array, pathlines: number): number {
  if (pathlines === 0) return Number.NaN;
  const kept = new Int32Array(pathlines);
  for (let p = 0; p < final.length; p++) if (final[p] >= 0) kept[final[p]] = counts.array[p];
  kept.sort();
  return (kept[(pathlines - 1) >> 1] + kept[pathlines >> 1]) / 2;
}
