import { ROLE, type RowBatch } from './row-batch.js';

/** Fills the frame numbers of a batch from its times; -1 for a time that is not among `times`. */
export function numberFrames(batch: RowBatch, times: Float64Array): void {
  const frame = batch.columns[ROLE.frame];
  const time = batch.columns[ROLE.time];
  let at = 0;
  for (let i = 0; i < batch.rows; i++) {
    if (times[at] !== time[i]) at = times[at + 1] === time[i] ? at + 1 : placeOf(times, time[i]);
    frame[i] = at;
    if (at < 0) at = 0;
  }
}

function placeOf(times: Float64Array, wanted: number): number {
  let low = 0;
  let high = times.length - 1;
  while (low <= high) {
    const middle = (low + high) >> 1;
    if (times[middle] === wanted) return middle;
    if (times[middle] < wanted) low = middle + 1;
    else high = middle - 1;
  }
  return -1;
}
