/** Which entries each entry names, held in memory while many are gone through in order, and what follows from it: the
 *  lineage of an entry by the length of the shortest way. Memory: 4 bytes for each link and each entry. */

export interface KnownLinks {
  /** Takes the targets of the next entry. */
  add(targets: readonly number[]): void;
  /** The entries that an entry names. */
  of(number: number): Iterable<number>;
}

/** Links of the entries from `from` on; of earlier ones somebody else must know. */
export function knownLinks(from: number, earlier: (number: number) => Iterable<number>): KnownLinks {
  let targets = new Uint32Array(1 << 10);
  let ends = new Uint32Array(1 << 10);
  let count = 0;
  let total = 0;
  return {
    add(named) {
      if (count + 1 > ends.length) ends = larger(ends);
      while (total + named.length > targets.length) targets = larger(targets);
      targets.set(named, total);
      total += named.length;
      ends[count] = total;
      count += 1;
    },
    of(number) {
      if (number < from) return earlier(number);
      const at = number - from;
      if (at >= count) return [];
      return targets.subarray(at === 0 ? 0 : ends[at - 1], ends[at]);
    },
  };
}

/** Everything that the given entries depend on, themselves included, with the length of the shortest way to it.
 *  @param distance  of the given entries */
export function lineageDistances(
  starts: Iterable<number>,
  distance: number,
  links: Pick<KnownLinks, 'of'>,
): Map<number, number> {
  const distances = new Map<number, number>();
  let level = [...new Set(starts)];
  for (let far = distance; level.length > 0; far += 1) {
    const next = new Set<number>();
    for (const number of level) distances.set(number, far);
    for (const number of level) {
      for (const target of links.of(number)) if (!distances.has(target)) next.add(target);
    }
    level = [...next];
  }
  return distances;
}

function larger(numbers: Uint32Array<ArrayBuffer>): Uint32Array<ArrayBuffer> {
  const grown = new Uint32Array(numbers.length * 2);
  grown.set(numbers);
  return grown;
}
