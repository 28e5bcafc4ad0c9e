/** 1 / 0.674490: standard deviation of a normal variable over the median of its size (the normal distribution's upper quartile). */
export const SIGMA_PER_MEDIAN = 1.482602;

/**
 * The value of rank `rank` (0-based) among `values[from .. to - 1]`, which are reordered in place (C. A. R. Hoare,
 * Commun. ACM 4 (1961) 321, with the median of three as pivot). No NaN may be among them. Expected cost O(n),
 * no allocation, the same answer for any order of the input.
 */
export function selectRank(values: Float64Array, from: number, to: number, rank: number): number {
  let low = from;
  let high = to - 1;
  const target = from + rank;
  while (low < high) {
    const middle = (low + high) >>> 1;
    const a = values[low]!;
    const b = values[middle]!;
    const c = values[high]!;
    const pivot = a < b ? (b < c ? b : Math.max(a, c)) : a < c ? a : Math.max(b, c);
    let i = low;
    let j = high;
    while (i <= j) {
      while (values[i]! < pivot) i++;
      while (values[j]! > pivot) j--;
      if (i <= j) {
        const keep = values[i]!;
        values[i] = values[j]!;
        values[j] = keep;
        i++;
        j--;
      }
    }
    if (target <= j) high = j;
    else if (target >= i) low = i;
    else break;
  }
  return values[target]!;
}

/**
 * Median of `values[0 .. count - 1]`, which are reordered in place: the middle value, or half the sum of the two
 * middle ones. NaN for count 0. No NaN may be among them. Expected cost O(count).
 */
export function medianInPlace(values: Float64Array, count: number): number {
  if (count === 0) return Number.NaN;
  const half = count >>> 1;
  const upper = selectRank(values, 0, count, half);
  if (count % 2 === 1) return upper;
  let lower = values[0]!;
  for (let i = 1; i < half; i++) if (values[i]! > lower) lower = values[i]!;
  return (lower + upper) / 2;
}

/** The same for a handful of values (below about 30): straight insertion, which beats selection there. */
export function medianOfFew(values: Float64Array, count: number): number {
  if (count === 0) return Number.NaN;
  for (let i = 1; i < count; i++) {
    const value = values[i]!;
    let j = i - 1;
    while (j >= 0 && values[j]! > value) {
      values[j + 1] = values[j]!;
      j--;
    }
    values[j + 1] = value;
  }
  const half = count >>> 1;
  return count % 2 === 1 ? values[half]! : (values[half - 1]! + values[half]!) / 2;
}
