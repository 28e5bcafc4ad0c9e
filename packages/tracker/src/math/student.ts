/** Two-sided 95 % point of the normal distribution. */
export const NORMAL_95 = 1.959964;

/** Two-sided 95 % points of Student's t for 1, 2, 3 degrees of freedom (published tables). */
const FIRST_POINTS = [12.706205, 4.302653, 3.182446] as const;

/**
 * Two-sided 95 % point of Student's t over that of the normal distribution, for any number of degrees of freedom from 1
 * on: a standard error times this makes 1.96 of it cover 95 %. From 3 on by the expansion of M. Abramowitz & I. A. Stegun,
 * Handbook of Mathematical Functions (1964), 26.7.5, good to 0.13 %; below, by a straight line in 1 / freedom between
 * published values, which errs upwards. Only + - * /.
 */
export function studentFactor(freedom: number): number {
  const nu = Math.max(freedom, 1);
  const x = 1 / nu;
  if (nu < 2) return line(x, 1 / 2, FIRST_POINTS[1], 1, FIRST_POINTS[0]) / NORMAL_95;
  if (nu < 3) return line(x, 1 / 3, FIRST_POINTS[2], 1 / 2, FIRST_POINTS[1]) / NORMAL_95;
  const z = NORMAL_95;
  const z2 = z * z;
  const first = (z2 + 1) / 4;
  const second = ((5 * z2 + 16) * z2 + 3) / 96;
  const third = (((3 * z2 + 19) * z2 + 17) * z2 - 15) / 384;
  const fourth = ((((79 * z2 + 776) * z2 + 1482) * z2 - 1920) * z2 - 945) / 92160;
  return 1 + x * (first + x * (second + x * (third + x * fourth)));
}

/** One-sided 95 % point of the normal distribution. */
const NORMAL_ONE_SIDED_95 = 1.644854;

/**
 * The same for a variance. Estimates of a variance are skew: where one comes out small, its standard error does too,
 * and what an interval symmetric about it misses lies above. Of normal variables the estimate is the truth times
 * chi square over freedom; 1.96 k sqrt(2 / freedom) of it reaches the truth with 95 % where k = (1 / q - 1) / (1.96
 * sqrt(2 / freedom)), q the 5 % point of chi square over freedom, after E. B. Wilson & M. M. Hilferty, Proc. Natl Acad.
 * Sci. 17 (1931) 684-688. Good to 2 % at 5 degrees of
 * freedom, 0.3 % from 20 on. Never below `studentFactor`. Below 3 degrees of freedom as for 3. Only + - * / sqrt.
 */
export function varianceFactor(freedom: number): number {
  const nu = Math.max(freedom, 3);
  const ninth = 2 / (9 * nu);
  const root = 1 - ninth - NORMAL_ONE_SIDED_95 * Math.sqrt(ninth);
  const factor = (1 / (root * root * root) - 1) / (NORMAL_95 * Math.sqrt(2 / nu));
  const student = studentFactor(freedom);
  return Math.max(factor, student);
}

function line(x: number, x0: number, y0: number, x1: number, y1: number): number {
  return y0 + ((x - x0) * (y1 - y0)) / (x1 - x0);
}
