/** The name that a misspelt one was probably meant to be.
 *
 *  Distance: insertions, deletions, substitutions and swaps of neighbours, each 1 (Damerau's four slips of the pen,
 *  Commun. ACM 7 (1964) 171), ignoring case. */

/** The nearest of `candidates`, the first of equals; undefined when none is near: at most one slip in three letters. */
export function nearMiss(word: string, candidates: Iterable<string>): string | undefined {
  const wanted = word.toLowerCase();
  let limit = Math.max(1, Math.floor(word.length / 3));
  let best: string | undefined;
  for (const candidate of candidates) {
    if (Math.abs(candidate.length - word.length) > limit) continue;
    const slips = countSlips(wanted, candidate.toLowerCase());
    if (slips > limit || slips >= Math.max(1, candidate.length)) continue;
    best = candidate;
    if (slips === 0) return best;
    limit = slips - 1;
  }
  return best;
}

/** "Did you mean `components`? " or nothing. */
export function didYouMean(word: string, candidates: Iterable<string>): string {
  const near = nearMiss(word, candidates);
  return near === undefined ? '' : `Did you mean \`${near}\`? `;
}

/** Cost O(a.length b.length), memory three rows. */
function countSlips(a: string, b: string): number {
  let twoUp: number[] = [];
  let up = Array.from({ length: b.length + 1 }, (_, j) => j);
  for (let i = 1; i <= a.length; i++) {
    const row = [i];
    for (let j = 1; j <= b.length; j++) {
      const differs = a[i - 1] === b[j - 1] ? 0 : 1;
      let slips = Math.min(up[j] + 1, row[j - 1] + 1, up[j - 1] + differs);
      const swapped = i > 1 && j > 1 && a[i - 1] === b[j - 2] && a[i - 2] === b[j - 1];
      if (swapped) slips = Math.min(slips, twoUp[j - 2] + 1);
      row.push(slips);
    }
    twoUp = up;
    up = row;
  }
  return up[b.length];
}
