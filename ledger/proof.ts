/** Proofs: one small document that shows an entry to be under a seal, to be checked with nothing of ours at hand
 *  (export/check-proof.mjs and check-proof.py do so with the standard library of Node and of Python alone). */

import type { Book } from './book.ts';
import { parseCanonical } from './canonical.ts';
import { ledgerPath, linesOf, withFile } from './ledger-file.ts';
import { checkInclusion, leafHash } from './merkle.ts';
import { ledgerDamaged, noProof } from './problem.ts';
import { parseSealText, readSeal, type Seal } from './seal.ts';
import { readKeys, signerOf } from './seal-keys.ts';
import { formatVerifierKey, openNote, parseVerifierKey, properBase64 } from './signed-note.ts';
import { askTree } from './tree.ts';

export interface ProofDocument {
  /** The entry's canonical bytes, without line feed. */
  readonly entry: string;
  /** Of its leaf: the entry's number less 1. */
  readonly index: number;
  /** Entries under the seal. */
  readonly size: number;
  /** The inclusion path, lowest first; hashes in base64. RFC 9162 section 2.1.3. */
  readonly inclusion: readonly string[];
  /** The seal, a signed note. */
  readonly checkpoint: string;
  /** The key that signed it: `name+hash+base64`. */
  readonly key: string;
}

export type SignedSeal = Seal & { readonly note: string };

/** Proves an entry to be under a seal of the book, the latest unless another is given. Cost: log n reads.
 *  @throws LedgerProblem 'no-proof' when the seal is unsigned, 'not-found', 'ledger-damaged'. */
export function prove(book: Book, number: number, seal = signedSeal(book.directory)): ProofDocument {
  const bytes = lineOf(book, number);
  const index = number - 1;
  const isRight = (path: Buffer[]) => isIncluded(bytes, index, path, seal);
  const path = askTree(book.directory, seal, (tree) => tree.inclusion(index), isRight);
  if (!isRight(path))
    throw ledgerDamaged(ledgerPath(book.directory), number, 'the entry is not under the seal');
  return {
    entry: bytes.toString('utf8'),
    index,
    size: seal.entries,
    inclusion: path.map((hash) => hash.toString('base64')),
    checkpoint: seal.note,
    key: formatVerifierKey(signerOf(seal, readKeys(book.directory))),
  };
}

/** Shows that an earlier seal of the book is a beginning of the latest one: RFC 9162 section 2.1.4; base64.
 *  @throws LedgerProblem 'no-proof' when it is not, or is of another book. */
export function proveConsistency(
  book: Book,
  earlier: Seal,
): { size: number; consistency: string[]; checkpoint: string } {
  const seal = signedSeal(book.directory);
  if (earlier.book !== seal.book || earlier.entries < 1 || earlier.entries > seal.entries)
    throw noProof(
      `The seal of ${earlier.entries} entries is no earlier one of this book`,
      'Take another seal.',
    );
  const whole = (size: number, root: string) => (found: { roots: Buffer[] }) =>
    found.roots[0]?.toString('base64') === root &&
    found.roots[1]?.toString('base64') === seal.root &&
    size > 0;
  const isRight = whole(earlier.entries, earlier.root);
  const found = askTree(
    book.directory,
    seal,
    (tree) => ({
      roots: [tree.rootAt(earlier.entries), tree.rootAt(seal.entries)],
      path: tree.consistency(earlier.entries),
    }),
    isRight,
  );
  if (!isRight(found))
    throw noProof(
      `The seal of ${earlier.entries} entries has another root than the ledger`,
      'Audit the book.',
    );
  const consistency = found.path.map((hash) => hash.toString('base64'));
  return { size: seal.entries, consistency, checkpoint: seal.note };
}

/** What a proof document shows, after checking it whole.
 *  @param trusted  a verifier key had from elsewhere; without one the document's own is used
 *  @throws LedgerProblem 'no-proof' saying what does not hold. */
export function checkProof(
  document: ProofDocument,
  trusted?: string,
): { book: string; number: number; time: string } {
  const fail = (what: string): never => {
    throw noProof(`The proof does not hold: ${what}`, 'Do not rely on it.');
  };
  if (trusted !== undefined && document.key !== trusted) fail('it rests on another key');
  let text: string;
  let entry: { book?: unknown; number?: unknown };
  try {
    text = openNote(Buffer.from(document.checkpoint), [parseVerifierKey(document.key)]).text;
    entry = parseCanonical(Buffer.from(document.entry)) as typeof entry;
  } catch (error) {
    return fail((error as Error).message.replace(/\.$/, ''));
  }
  const seal = parseSealText(text);
  if (seal === null) return fail('the checkpoint is no seal');
  if (entry.book !== seal.book || entry.number !== document.index + 1 || seal.entries !== document.size)
    fail('entry, index, size and seal do not belong together');
  const path = document.inclusion.map((hash) => properBase64(hash) ?? Buffer.alloc(0));
  if (!isIncluded(Buffer.from(document.entry), document.index, path, seal))
    fail('the entry is not under the seal');
  return { book: seal.book, number: document.index + 1, time: seal.time };
}

function isIncluded(
  bytes: Buffer,
  index: number,
  path: readonly Buffer[],
  seal: { readonly entries: number; readonly root: string },
): boolean {
  return checkInclusion(leafHash(bytes), index, seal.entries, path, Buffer.from(seal.root, 'base64'));
}

/** The latest seal. @throws LedgerProblem 'no-proof' when there is none, or it is unsigned. */
export function signedSeal(directory: string): SignedSeal {
  const seal = readSeal(directory);
  if (typeof seal === 'string')
    throw noProof(`The book in ${directory} has no seal that can be read`, 'Audit the book.');
  if (seal.note === null)
    throw noProof('The book was not signed so far', 'Whoever writes in it next signs it; then ask again.');
  return { ...seal, note: seal.note };
}

/** The canonical bytes of an entry. */
function lineOf(book: Book, number: number): Buffer {
  // Reads the entry once more than needed, for the errors that book.entry has.
  book.entry(number);
  const row = book.ask((index) =>
    index.get<{ position: number; length: number }>(
      'SELECT position, length FROM entries WHERE number = ?',
      number,
    ),
  );
  const { position, length } = row ?? { position: 0, length: 0 };
  return withFile(ledgerPath(book.directory), (descriptor) => {
    const [line] = linesOf(descriptor, position, position + length + 1);
    return Buffer.from(line?.bytes ?? []);
  });
}
