/** Proofs in a bag: for each entry a document that shows it to be under the signed seal of its book (ledger/proof.ts),
 *  the seal itself, and scripts that check a proof with nothing but Node or Python.
 *
 *      data/proofs/N.json    the proof of entry N
 *      data/seal.txt         the seal that all of them are under
 *
 *  A proof shows that an entry stands in the ledger whose seal it is. Whose seal that is, only somebody who has the key
 *  or the seal from elsewhere can say. */

import { existsSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import type { Book } from '../../ledger/book.ts';
import { LedgerProblem } from '../../ledger/problem.ts';
import { checkProof, type ProofDocument, prove, type SignedSeal, signedSeal } from '../../ledger/proof.ts';
import { sourceRoot } from '../program.ts';
import type { CheckedBag } from './check-bag.ts';
import type { Gathered } from './gather.ts';
import type { BaggedEntry } from './open-bag.ts';
import type { PayloadRequest } from './payload.ts';
import { badBag } from './problem.ts';

const SEAL = 'data/seal.txt';
const LARGEST_PROOF = 1 << 25;

export interface Proofs {
  /** The text of each entry's proof, by number. */
  readonly documents: ReadonlyMap<number, string>;
  /** What they rest on; null without proofs. */
  readonly seal: Pick<SignedSeal, 'entries' | 'time'> | null;
  /** The seal, and the scripts that check a proof. */
  readonly beside: PayloadRequest['texts'];
}

/** Where the proof of an entry lies. */
export function proofPath(number: number): string {
  return `data/proofs/${number}.json`;
}

/** Proofs of gathered entries under the latest seal; none where the book has no signed seal yet. The seal is read once:
 *  others may append meanwhile. @throws LedgerProblem 'ledger-damaged' */
export function proofsOf(book: Book, { entries }: Gathered): Proofs {
  const seal = latestSeal(book);
  if (seal === null) return { documents: new Map(), seal, beside: [] };
  const proofOf = (number: number) => `${JSON.stringify(prove(book, number, seal), null, 2)}\n`;
  const documents = new Map(entries.map(({ entry: { number } }) => [number, proofOf(number)]));
  const about = 'The seal of the book';
  const text = { path: SEAL, role: 'proof' as const, entry: null, text: seal.note, about };
  return { documents, seal, beside: [text, ...checkers()] };
}

function latestSeal(book: Book): SignedSeal | null {
  try {
    return signedSeal(book.directory);
  } catch (error) {
    if (error instanceof LedgerProblem && error.code === 'no-proof') return null;
    throw error;
  }
}

function checkers(): PayloadRequest['texts'] {
  const scripts = { 'check-proof.mjs': 'Node', 'check-proof.py': 'Python' };
  return Object.entries(scripts).flatMap(([name, language]) => {
    const file = join(sourceRoot, 'ledger', 'export', name);
    if (!existsSync(file)) return [];
    const about = `Checks a proof with ${language} alone`;
    return [
      {
        path: `data/${name}`,
        role: 'checker' as const,
        entry: null,
        text: readFileSync(file, 'utf8'),
        about,
      },
    ];
  });
}

export interface CheckedProof {
  /** The document as it lies in the bag. */
  readonly text: Buffer;
  /** The verifier key whose signature holds, `name+hash+base64`. */
  readonly key: string;
  /** The seal's. */
  readonly time: string;
}

/** Checks the proofs in a bag: either none is there, or every entry has one and all are under one seal.
 *  @throws RunnerProblem 'bad-bag' */
export function checkProofs(
  checked: CheckedBag,
  entries: ReadonlyMap<number, BaggedEntry>,
  read: (digest: string) => Buffer,
): Map<number, CheckedProof> {
  const proofs = new Map<number, CheckedProof>();
  const paths = [...checked.payload.keys()].filter((path) => path.startsWith('data/proofs/'));
  if (paths.length === 0 && !checked.payload.has(SEAL)) return proofs;
  const seal = checked.payload.get(SEAL);
  if (seal === undefined) throw badBag(SEAL, 'the seal that the proofs are under', 'none');
  const checkpoint = read(seal).toString('utf8');
  for (const [number, bagged] of entries) {
    const path = proofPath(number);
    const digest = checked.payload.get(path);
    if (digest === undefined) throw badBag(path, `the proof of entry ${number}`, 'none');
    if ((checked.sizes.get(path) ?? 0) > LARGEST_PROOF)
      throw badBag(path, `at most ${LARGEST_PROOF} bytes`, 'more');
    proofs.set(number, checkOne(path, read(digest), bagged, checkpoint));
  }
  if (paths.length !== proofs.size)
    throw badBag('data/proofs', `proofs of ${proofs.size} entries`, `${paths.length} files`);
  const keys = new Set([...proofs.values()].map(({ key }) => key));
  if (keys.size > 1) throw badBag('data/proofs', 'proofs that rest on one key', `${keys.size} keys`);
  return proofs;
}

function checkOne(
  path: string,
  text: Buffer,
  { line, entry }: BaggedEntry,
  checkpoint: string,
): CheckedProof {
  const document = parseProof(path, text);
  if (document.entry !== line.toString('utf8'))
    throw badBag(path, `entry ${entry.number} as it is in the bag`, 'another');
  if (document.checkpoint !== checkpoint) throw badBag(path, `the seal in ${SEAL}`, 'another');
  try {
    const { time } = checkProof(document);
    return { text, key: document.key, time };
  } catch (error) {
    throw badBag(path, 'a proof that holds', (error as Error).message.replace(/\.$/, ''));
  }
}

function parseProof(path: string, text: Buffer): ProofDocument {
  try {
    const { entry, index, size, inclusion, checkpoint, key } = JSON.parse(text.toString('utf8'));
    const texts = [entry, checkpoint, key, ...inclusion].every((each) => typeof each === 'string');
    if (texts && Number.isSafeInteger(index) && Number.isSafeInteger(size)) {
      return { entry, index, size, inclusion, checkpoint, key };
    }
  } catch {
    // Told below.
  }
  throw badBag(path, 'a proof { entry, index, size, inclusion, checkpoint, key }', 'something else');
}
