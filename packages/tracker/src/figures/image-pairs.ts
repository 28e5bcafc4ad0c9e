import type { RunRecord } from '../store/run-record.js';

/** Whether a run was recorded in image pairs: every sample then rests on two detections, every pathline is one sample. */
export function isPairs(record: Pick<RunRecord, 'settings'>): boolean {
  return record.settings.some(({ key, value }) => key === 'clock.pairs.delay' && value !== null);
}
