/** What can be wrong with a bag, each text built once. */

import { advice, RunnerProblem } from '../problem.ts';

/** A bag that is refused whole.
 *  @param place  the file in the bag, with the line where there is one */
export function badBag(
  place: string,
  expected: string,
  found: string,
  what: string = advice['bad-bag'],
): RunnerProblem {
  const message = `${place}: expected ${expected}, got ${found}. ${what}`;
  const line = /^(.*):(\d+)$/.exec(place);
  const at = line === null ? { file: place } : { file: line[1] as string, line: Number(line[2]) };
  return new RunnerProblem('bad-bag', message, at, 1);
}

/** Something that is no bag was named as one. */
export function noBag(directory: string, found: string): RunnerProblem {
  const message = `${directory}: expected a bag, a directory with bagit.txt in it, got ${found}. ${advice['no-bag']}`;
  return new RunnerProblem('no-bag', message, { file: directory }, 2);
}

/** The place where a bag is to be written is taken. */
export function placeTaken(directory: string, found: string): RunnerProblem {
  const message = `${directory}: expected an empty place for the bag, got ${found}. Name another directory with --to.`;
  return new RunnerProblem('bag-not-written', message, { file: directory }, 2);
}

/** Something that the bag must hold cannot be had. */
export function cannotBag(place: string, expected: string, found: string, what: string): RunnerProblem {
  return new RunnerProblem('bag-not-written', `${place}: expected ${expected}, got ${found}. ${what}`, {}, 1);
}

export function badBagCall(message: string): RunnerProblem {
  return new RunnerProblem('bad-call', message, {}, 2);
}
