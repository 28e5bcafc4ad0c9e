/** Taylor coefficients of sine, 1 / (2k + 1)! with alternating sign, highest first, down to x^3. */
const SINE = [
  1 / 355687428096000,
  -1 / 1307674368000,
  1 / 6227020800,
  -1 / 39916800,
  1 / 362880,
  -1 / 5040,
  1 / 120,
  -1 / 6,
];
/** Taylor coefficients of cosine, 1 / (2k)! with alternating sign, highest first, down to x^2. */
const COSINE = [1 / 20922789888000, -1 / 87178291200, 1 / 479001600, -1 / 3628800, 1 / 40320, -1 / 720, 1 / 24, -1 / 2];

/**
 * Cosine and sine of an angle in degrees, from + - * / alone, so that every engine gives the same bits
 * (`Math.sin` does not). Quarter turns are exact: `turn(90)` is [0, 1].
 *
 * The angle is reduced to at most 45 degrees, where the Taylor series cut after x^17 and x^16 leaves
 * (pi/4)^19 / 19! = 8e-20 and (pi/4)^18 / 18! = 2e-18: below half a unit in the last place. Error at most
 * 2 units in the last place of 1.
 */
export function turn(degrees: number): readonly [cosine: number, sine: number] {
  const inCircle = degrees % 360;
  const quarters = Math.round(inCircle / 90);
  // Exact: both terms are multiples of the last place of `inCircle` and the difference is no larger.
  const x = (inCircle - 90 * quarters) * (Math.PI / 180);
  const square = x * x;
  let s = 0;
  for (const coefficient of SINE) s = s * square + coefficient;
  let c = 0;
  for (const coefficient of COSINE) c = c * square + coefficient;
  const sine = x + x * square * s;
  const cosine = 1 + square * c;
  // `+ 0` turns -0 into 0: one form of zero.
  switch (((quarters % 4) + 4) % 4) {
    case 0:
      return [cosine, sine + 0];
    case 1:
      return [-sine + 0, cosine];
    case 2:
      return [-cosine, -sine + 0];
    default:
      return [sine + 0, -cosine];
  }
}
