/** 10^0 .. 10^22: every power of ten that a Float64 holds exactly (5^22 < 2^53). */
const POWERS = Float64Array.from({ length: 23 }, (_, exponent) => Number(`1e${exponent}`));

/** Veltkamp's splitting constant for Float64, 2^27 + 1 (Dekker 1971, doi:10.1007/BF01397083). */
const SPLITTER = 134217729;

/** Room for the share of the second quotient that rounding may have taken; its true bound is 2^-51. */
const MARGIN = 2 ** -45;

/** Tokens that are numbers by name. Lower case. */
const NAMED: Readonly<Record<string, number>> = {
  nan: Number.NaN,
  inf: Number.POSITIVE_INFINITY,
  infinity: Number.POSITIVE_INFINITY,
};

/**
 * Reads one decimal number out of `bytes[start .. end - 1]` into `into[index]`; false when the bytes are no
 * number, and then `into` is left alone. Blanks and one pair of double quotes around it are ignored. Grammar:
 * sign, digits, mark, digits, exponent with e, E, d or D (Fortran), or nan, inf, infinity in any case.
 * Hexadecimal and empty tokens are no numbers.
 *
 * Accuracy: the Float64 nearest to the written decimal, the same bits as `Number()`. Up to 15 digits one exact
 * division or product does it (Clinger 1990, doi:10.1145/93542.93557); 16 to 19 digits are divided in
 * double-double and accepted when the rounding is certain; all else goes through `Number()`.
 * Cost: about 20 ns for a short token, 40 ns for 17 digits.
 */
export function parseNumberInto(
  bytes: Uint8Array,
  start: number,
  end: number,
  decimalMark: number,
  into: Float64Array,
  index: number,
): boolean {
  let first = start;
  let last = end;
  while (first < last && (bytes[first] === 32 || bytes[first] === 9)) first++;
  while (last > first && (bytes[last - 1] === 32 || bytes[last - 1] === 9)) last--;
  if (last - first >= 2 && bytes[first] === 34 && bytes[last - 1] === 34) {
    first++;
    last--;
    while (first < last && bytes[first] === 32) first++;
    while (last > first && bytes[last - 1] === 32) last--;
  }
  let at = first;
  const negative = bytes[at] === 45;
  if (at < last && (negative || bytes[at] === 43)) at++;

  // The first 15 significant digits go to `high`, the next 4 to `low`; leading zeros count for nothing.
  let high = 0;
  let low = 0;
  let significant = 0;
  let digits = 0;
  let places = 0;
  let afterMark = false;
  for (; at < last; at++) {
    const byte = bytes[at];
    const digit = byte - 48;
    if (digit >= 0 && digit <= 9) {
      digits++;
      if (afterMark) places++;
      if (significant > 0 || digit > 0) {
        significant++;
        if (significant <= 15) high = high * 10 + digit;
        else if (significant <= 19) low = low * 10 + digit;
      }
    } else if (byte === decimalMark && !afterMark) afterMark = true;
    else break;
  }
  if (digits === 0) return parseNamed(bytes, first, last, into, index);

  let exponent = 0;
  if (at < last) {
    const letter = bytes[at] | 32;
    if (letter !== 101 && letter !== 100) return false;
    at++;
    const down = bytes[at] === 45;
    if (at < last && (down || bytes[at] === 43)) at++;
    if (at >= last) return false;
    for (; at < last; at++) {
      const digit = bytes[at] - 48;
      if (digit < 0 || digit > 9) return false;
      if (exponent < 100_000) exponent = exponent * 10 + digit;
    }
    if (down) exponent = -exponent;
  }

  const shift = exponent - places;
  let value = Number.NaN;
  if (significant === 0) value = 0;
  else if (significant <= 15) {
    if (shift <= 0 && shift >= -22) value = high / POWERS[-shift];
    else if (shift > 0 && shift <= 22) value = high * POWERS[shift];
  } else if (significant <= 19 && shift <= 0 && shift >= -22) {
    value = divideLong(high, low, POWERS[significant - 15], POWERS[-shift]);
  }
  if (Number.isNaN(value)) value = slowNumber(bytes, first, last, decimalMark);
  else if (negative) value = -value;
  into[index] = value;
  return true;
}

/**
 * (high * scale + low) / divisor to the nearest Float64, or NaN where the nearest cannot be told. `high` has 15
 * digits, `scale` is 10^k and `low` < 10^k with k <= 4, `divisor` is an exact power of ten.
 */
function divideLong(high: number, low: number, scale: number, divisor: number): number {
  // The product and its rounding error, exact: scale has at most 14 bits and needs no splitting (Dekker 1971).
  const product = high * scale;
  const big = SPLITTER * high;
  const highHead = big - (big - high);
  const highTail = high - highHead;
  const rest = highHead * scale - product + highTail * scale + low;
  const head = product + rest;
  const tail = rest - (head - product);

  const first = head / divisor;
  const firstBig = SPLITTER * first;
  const firstHead = firstBig - (firstBig - first);
  const firstTail = first - firstHead;
  const divisorBig = SPLITTER * divisor;
  const divisorHead = divisorBig - (divisorBig - divisor);
  const divisorTail = divisor - divisorHead;
  const back = first * divisor;
  const backError =
    firstHead * divisorHead - back + firstHead * divisorTail + firstTail * divisorHead + firstTail * divisorTail;
  const second = (head - back - backError + tail) / divisor;

  const upper = first + second * (1 + MARGIN);
  const lower = first + second * (1 - MARGIN);
  return upper === lower ? upper : Number.NaN;
}

/** Any well-formed token through the engine's own conversion. Cost: about 200 ns. */
function slowNumber(bytes: Uint8Array, start: number, end: number, decimalMark: number): number {
  let text = '';
  for (let i = start; i < end; i++) {
    const byte = bytes[i];
    if (byte === decimalMark) text += '.';
    else if ((byte | 32) === 100) text += 'e';
    else text += String.fromCharCode(byte);
  }
  return Number(text);
}

function parseNamed(bytes: Uint8Array, start: number, end: number, into: Float64Array, index: number): boolean {
  if (end - start > 9 || end - start < 3) return false;
  let text = '';
  for (let i = start; i < end; i++) text += String.fromCharCode(bytes[i]);
  const negative = text.startsWith('-');
  if (negative || text.startsWith('+')) text = text.slice(1);
  const value = NAMED[text.toLowerCase()];
  if (value === undefined) return false;
  into[index] = negative ? -value : value;
  return true;
}
