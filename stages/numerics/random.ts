/** Seeded random numbers: the same seed gives the same sequence everywhere. */

import { uniformFloat64 } from 'pure-rand/distribution/uniformFloat64';
import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import { cos, ln } from './elementary.ts';

export interface RandomStream {
  /** Uniform in [0, 1). */
  uniform(): number;
  /** Uniform in [low, high). */
  between(low: number, high: number): number;
  /** Standard normal deviate (Box and Muller 1958, Ann. Math. Stat. 29, 610; one of the pair). */
  normal(): number;
  /** Uniform integer in [low, high], both included. */
  integer(low: number, high: number): number;
}

/** A stream of random numbers for a seed and a purpose: streams of different purposes do not overlap in practice, so
 *  that drawing more noise does not change the gains.
 *  @param seed     integer
 *  @param purpose  a short fixed name */
export function randomStream(seed: number, purpose: string): RandomStream {
  const generator = xoroshiro128plus(mixSeed(seed, purpose));
  const uniform = () => uniformFloat64(generator);
  return {
    uniform,
    between: (low, high) => low + (high - low) * uniform(),
    normal: () => {
      const radius = Math.sqrt(-2 * ln(1 - uniform()));
      return radius * cos(2 * Math.PI * uniform());
    },
    integer: (low, high) => uniformInt(generator, low, high),
  };
}

/** FNV-1a over the seed's digits and the purpose, 32 bits (Fowler, Noll and Vo; from memory). */
function mixSeed(seed: number, purpose: string): number {
  let hash = 0x811c9dc5;
  for (const character of `${seed}:${purpose}`) {
    hash = Math.imul(hash ^ (character.codePointAt(0) ?? 0), 0x01000193);
  }
  return hash | 0;
}
