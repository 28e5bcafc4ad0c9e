/** Edit distance (Levenshtein): fewest insertions, deletions and changes of one character. O(|a| |b|) time. */
export function editDistance(a: string, b: string): number {
  let previous = Array.from({ length: b.length + 1 }, (_, j) => j);
  for (let i = 1; i <= a.length; i++) {
    const current = [i];
    for (let j = 1; j <= b.length; j++) {
      const change = previous[j - 1]! + (a[i - 1] === b[j - 1] ? 0 : 1);
      current.push(Math.min(change, previous[j]! + 1, current[j - 1]! + 1));
    }
    previous = current;
  }
  return previous[b.length]!;
}

/**
 * The known word nearest to `word`, capitals and hyphens aside, or null when none is near enough to be worth
 * naming (more than half of its letters would change). Of equally near ones the first.
 */
export function nearestWord(word: string, known: readonly string[]): string | null {
  const plain = (text: string) => text.toLowerCase().replace(/[-_\s]/g, '');
  let best: string | null = null;
  let bestDistance = Number.POSITIVE_INFINITY;
  for (const candidate of known) {
    const distance = editDistance(plain(word), plain(candidate));
    if (distance < bestDistance) {
      best = candidate;
      bestDistance = distance;
    }
  }
  return best !== null && bestDistance <= Math.max(plain(word).length, plain(best).length) / 2 ? best : null;
}
