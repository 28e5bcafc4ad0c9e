import type { RowReason } from './dump.js';
import { ROLE, ROLES, type Role, type RowBatch } from './row-batch.js';
import type { RowLedger } from './row-ledger.js';

/** Things of rows that are kept but worth a remark. */
export interface RowOddities {
  /** Pathline numbers that are not whole or beyond Int32: kept as "not linked". */
  pathlineNumbers: number;
}

/**
 * Sets aside the rows of a batch that hold no detection: a frame number that is not finite, not whole or beyond
 * Int32, a position or time that is not finite. The others close up in place, in order. Pathline numbers become
 * whole numbers, -1 for "not linked" (missing, negative, or not a number of a pathline). A coordinate of -0 becomes 0,
 * so that one place has one form.
 * Cost: one look at each row, about 3 ns.
 */
export function judgeRows(batch: RowBatch, file: string, ledger: RowLedger, oddities: RowOddities): void {
  const [frame, x, y, z, , pathline, time] = batch.columns;
  const hasZ = batch.used[ROLE.z] === 1;
  const hasTime = batch.used[ROLE.time] === 1;
  const rows = batch.rows;
  let kept = 0;
  for (let i = 0; i < rows; i++) {
    const number = frame[i];
    x[i] += 0;
    y[i] += 0;
    if (hasZ) z[i] += 0;
    // A difference with itself is 0 for every finite number and NaN for the others.
    let unfit = x[i] - x[i] + (y[i] - y[i]);
    if (hasZ) unfit += z[i] - z[i];
    if (hasTime) unfit += time[i] - time[i];
    if (unfit !== 0 || number !== (number | 0)) {
      const [reason, role] = why(batch, i);
      ledger.setAside(reason, file, batch.line[i], () => {
        const where = batch.line[i] > 0 ? '' : ` in row ${batch.row[i]} (counted from 0)`;
        return `${role} is ${inWords(batch.columns[ROLE[role]][i])}${where}`;
      });
      continue;
    }
    if (kept !== i) {
      for (let role = 0; role < ROLES.length; role++) batch.columns[role][kept] = batch.columns[role][i];
      batch.line[kept] = batch.line[i];
      batch.row[kept] = batch.row[i];
    }
    kept++;
  }
  batch.rows = kept;
  if (batch.used[ROLE.pathline] !== 1) return;
  for (let i = 0; i < kept; i++) {
    const number = pathline[i];
    if (number === (number | 0) && number >= 0) continue;
    if (number > 0) oddities.pathlineNumbers++;
    pathline[i] = -1;
  }
}

/** A value as found; what is written in many ways (inf, Infinity, 1e999, nan, nothing) by what it means. */
function inWords(value: number): string {
  if (Number.isNaN(value)) return 'not a number';
  return Number.isFinite(value) ? String(value) : value > 0 ? 'infinite' : 'minus infinite';
}

function why(batch: RowBatch, i: number): readonly [RowReason, Role] {
  const number = batch.columns[ROLE.frame][i];
  if (!Number.isFinite(number)) return ['not-finite', 'frame'];
  if (!Number.isInteger(number)) return ['frame-not-whole', 'frame'];
  if (number !== (number | 0)) return ['frame-out-of-range', 'frame'];
  for (const role of ['x', 'y', 'z'] as const) {
    if (batch.used[ROLE[role]] === 1 && !Number.isFinite(batch.columns[ROLE[role]][i])) return ['not-finite', role];
  }
  return ['time-not-finite', 'time'];
}
