/** Bins a decade of stated risk. */
const PER_DECADE = 100;
/** Decades below 1 that are told apart; smaller risks fall into the lowest bin. */
const DECADES = 8;
const BINS = PER_DECADE * DECADES;

/** Links by stated risk, in bins even in the logarithm: wrong ones, all, and the sum of their risks. */
export interface RiskPool {
  readonly links: Float64Array;
  readonly wrong: Float64Array;
  readonly stated: Float64Array;
}

export function emptyPool(): RiskPool {
  return { links: new Float64Array(BINS), wrong: new Float64Array(BINS), stated: new Float64Array(BINS) };
}

/**
 * Adds the links that count: `made` and `truth` hold the row before each row, -1 for none (see `joinedBefore`), the
 * risk of a link stands on the later of its two rows.
 */
export function addLinks(pool: RiskPool, made: Int32Array, truth: Int32Array, risk: ArrayLike<number>): void {
  for (let row = 0; row < made.length; row++) {
    if (made[row] < 0) continue;
    const bin = binOf(risk[row]);
    pool.links[bin]++;
    pool.stated[bin] += risk[row];
    if (made[row] !== truth[row]) pool.wrong[bin]++;
  }
}

export function addPool(pool: RiskPool, more: RiskPool): void {
  for (let bin = 0; bin < BINS; bin++) {
    pool.links[bin] += more.links[bin];
    pool.wrong[bin] += more.wrong[bin];
    pool.stated[bin] += more.stated[bin];
  }
}

function binOf(risk: number): number {
  if (!(risk >= 0 && risk <= 1)) throw new Error(`link risk: got ${risk}, expected a probability`);
  const bin = Math.floor(PER_DECADE * (DECADES + Math.log10(risk)));
  return Math.max(0, Math.min(BINS - 1, bin));
}

/** One decade of stated risk. */
export interface RiskDecade {
  /** Lower and upper bound of the stated risk; the lowest begins at 0. */
  readonly from: number;
  readonly to: number;
  readonly links: number;
  /** Sum of the stated risks: wrong links to expect. */
  readonly expected: number;
  readonly wrong: number;
}

export interface RiskSummary {
  readonly decades: readonly RiskDecade[];
  /** Probability that a wrong link has a larger stated risk than a right one, ties by half; NaN where one sort is missing. */
  readonly areaUnderCurve: number;
  readonly expected: number;
  readonly wrong: number;
}

/** The decades from 1e-5 to 1 and all below in one, and how well the risk tells wrong from right. */
export function summarise(pool: RiskPool): RiskSummary {
  const sum = (column: Float64Array, from: number, to: number) => column.subarray(from, to).reduce((a, b) => a + b, 0);
  const decade = (from: number, to: number): RiskDecade => ({
    from: from === 0 ? 0 : Number(`1e${from - DECADES}`),
    to: Number(`1e${to - DECADES}`),
    links: sum(pool.links, from * PER_DECADE, to * PER_DECADE),
    expected: sum(pool.stated, from * PER_DECADE, to * PER_DECADE),
    wrong: sum(pool.wrong, from * PER_DECADE, to * PER_DECADE),
  });
  const wrong = sum(pool.wrong, 0, BINS);
  const right = sum(pool.links, 0, BINS) - wrong;
  let below = 0;
  let area = 0;
  for (let bin = 0; bin < BINS; bin++) {
    const rightHere = pool.links[bin] - pool.wrong[bin];
    area += pool.wrong[bin] * (below + 0.5 * rightHere);
    below += rightHere;
  }
  return {
    decades: [decade(0, DECADES - 5), ...[5, 4, 3, 2, 1].map((n) => decade(DECADES - n, DECADES - n + 1))],
    areaUnderCurve: wrong > 0 && right > 0 ? area / (wrong * right) : Number.NaN,
    expected: sum(pool.stated, 0, BINS),
    wrong,
  };
}
