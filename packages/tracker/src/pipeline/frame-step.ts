import type { DetectionBlock } from '../core/columns.js';
import type { ClockSettings } from '../run/settings.js';

/**
 * Step of the frame numbers: their greatest common distance. A dump of every second frame counts 0, 2, 4 ...; its
 * frames follow one another all the same and none is missing. 1 for image pairs and bursts, whose numbers mean more,
 * and for a single frame.
 */
export function frameStep(frameNumbers: Int32Array, clock: ClockSettings): number {
  if (clock.kind === 'pairs' || clock.kind === 'bursts') return 1;
  let step = 0;
  for (let k = 1; k < frameNumbers.length && step !== 1; k++) {
    let a = step;
    let b = frameNumbers[k] - frameNumbers[k - 1];
    while (b !== 0) [a, b] = [b, a % b];
    step = a;
  }
  return step > 0 ? step : 1;
}

/** Counts the frames of a block in steps from the first of the run, in place: what linking and fits work with. */
export function countInSteps(block: DetectionBlock, first: number, step: number): void {
  if (step === 1) return;
  for (let k = 0; k < block.number.length; k++) block.number[k] = (block.number[k] - first) / step;
}

/** The frame numbers of the dump again, in place. */
export function restoreNumbers(number: Int32Array, first: number, step: number): void {
  if (step === 1) return;
  for (let k = 0; k < number.length; k++) number[k] = first + number[k] * step;
}
