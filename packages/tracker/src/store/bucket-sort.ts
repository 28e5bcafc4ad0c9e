/**
 * Pathlines of a bucket. Small, so that a bucket of very long pathlines stays small; a batch holds only the buckets
 * of the particles then in view, so that there are some hundreds of pieces a batch whatever the run's length.
 */
export const BUCKET_PATHLINES = 64;

/**
 * Stable counting sort of rows by bucket: row i goes to slots[i]. Returns the buckets present, ascending, and the first
 * sorted row of each.
 */
export function sortByBucket(
  pathline: Int32Array,
  rows: number,
  slots: Int32Array,
): { buckets: Int32Array; firstRows: Int32Array } {
  let low = Number.POSITIVE_INFINITY;
  let high = -1;
  for (let i = 0; i < rows; i++) {
    if (pathline[i] < low) low = pathline[i];
    if (pathline[i] > high) high = pathline[i];
  }
  const first = Math.floor(low / BUCKET_PATHLINES);
  const next = new Int32Array(Math.floor(high / BUCKET_PATHLINES) - first + 1);
  for (let i = 0; i < rows; i++) next[((pathline[i] / BUCKET_PATHLINES) | 0) - first]++;
  const buckets: number[] = [];
  const firstRows: number[] = [];
  let sum = 0;
  for (let bucket = 0; bucket < next.length; bucket++) {
    const count = next[bucket];
    next[bucket] = sum;
    if (count > 0) {
      buckets.push(first + bucket);
      firstRows.push(sum);
    }
    sum += count;
  }
  for (let i = 0; i < rows; i++) slots[i] = next[((pathline[i] / BUCKET_PATHLINES) | 0) - first]++;
  return { buckets: Int32Array.from(buckets), firstRows: Int32Array.from(firstRows) };
}
