/** Near misses: what a person probably meant. */

/** Up to three candidates that differ from a word in few letters, nearest first; case does not count. */
export function nearMisses(word: string, candidates: Iterable<string>): string[] {
  const wanted = word.toLowerCase();
  const most = Math.max(1, Math.floor(wanted.length / 3));
  return [...new Set(candidates)]
    .map((candidate) => ({ candidate, distance: editDistance(wanted, candidate.toLowerCase()) }))
    .filter(({ distance }) => distance <= most)
    .sort((a, b) => a.distance - b.distance || (a.candidate < b.candidate ? -1 : 1))
    .slice(0, 3)
    .map(({ candidate }) => candidate);
}

/** Letters to insert, remove or replace (Levenshtein's distance). Cost: the product of the lengths. */
function editDistance(a: string, b: string): number {
  let row = Array.from({ length: b.length + 1 }, (_, j) => j);
  for (let i = 1; i <= a.length; i += 1) {
    const next = [i];
    for (let j = 1; j <= b.length; j += 1) {
      const replace = (row[j - 1] ?? 0) + (a[i - 1] === b[j - 1] ? 0 : 1);
      next.push(Math.min(replace, (row[j] ?? 0) + 1, (next[j - 1] ?? 0) + 1));
    }
    row = next;
  }
  return row[b.length] ?? 0;
}
