/** Errors of the book, each text built once. Every text says where, what was expected, what stood there, what to do. */

/** Append-only; no code is reused. */
export type LedgerCode =
  | 'no-book'
  | 'book-unreadable'
  | 'ledger-damaged'
  | 'store-missing'
  | 'store-damaged'
  | 'not-found'
  | 'ambiguous'
  | 'cannot-write'
  | 'not-canonical'
  | 'bad-draft'
  | 'bad-call'
  | 'file-changed'
  | 'file-unreadable'
  | 'bad-key'
  | 'bad-note'
  | 'no-proof';

/** The call was wrong and nothing was started; with every other code the work ended badly. */
const WRONG_CALL: ReadonlySet<LedgerCode> = new Set(['no-book', 'not-found', 'ambiguous', 'bad-call']);

export class LedgerProblem extends Error {
  override readonly name = 'LedgerProblem';
  readonly code: LedgerCode;
  readonly file: string | null;
  readonly line: number | null;
  /** The exit status of a command that ends with this problem. */
  readonly exitStatus: 1 | 2;

  constructor(
    code: LedgerCode,
    message: string,
    place: { file?: string; line?: number } = {},
    options?: ErrorOptions,
  ) {
    super(message, options);
    this.code = code;
    this.file = place.file ?? null;
    this.line = place.line ?? null;
    this.exitStatus = WRONG_CALL.has(code) ? 2 : 1;
  }
}

// The directory

/** No book where one was asked for. */
export function noBook(directory: string): LedgerProblem {
  return new LedgerProblem(
    'no-book',
    `${directory}: there is no book here. Run a recipe to start one, or name the book's directory with --book.`,
    { file: directory },
  );
}

/** A book was to be started in a directory that holds other things. */
export function otherDirectory(directory: string, found: readonly string[]): LedgerProblem {
  const some = found.slice(0, 3).join(', ') + (found.length > 3 ? ', …' : '');
  return new LedgerProblem(
    'no-book',
    `${directory}: expected a book, an empty directory or none, got a directory with ${some}. ` +
      'Name another directory with --book.',
    { file: directory },
  );
}

export function notADirectory(directory: string): LedgerProblem {
  return new LedgerProblem(
    'no-book',
    `${directory}: expected a directory, got a file. Name another directory with --book.`,
    { file: directory },
  );
}

export function badBookName(name: string): LedgerProblem {
  return new LedgerProblem(
    'bad-call',
    `The book's name: expected 1 to 100 characters without control characters, got ${JSON.stringify(name)}. Choose another.`,
  );
}

/** The file system refuses to give something of the book. */
export function bookUnreadable(file: string, cause: unknown): LedgerProblem {
  return new LedgerProblem(
    'book-unreadable',
    `${file}: cannot be read (${reasonOf(cause)}). Check the file's permissions and the disk.`,
    { file },
    { cause },
  );
}

// Writing

export function cannotWrite(file: string, cause: unknown): LedgerProblem {
  return new LedgerProblem(
    'cannot-write',
    `${file}: cannot be written (${reasonOf(cause)}). What was entered is safe; mend the cause and repeat.`,
    { file },
    { cause },
  );
}

/** Another process holds the book for too long. */
export function noTurn(file: string, seconds: number): LedgerProblem {
  return new LedgerProblem(
    'cannot-write',
    `${file}: another process has been writing to this book for ${seconds} s. Wait for it, or look whether it hangs.`,
    { file },
  );
}

export function nobodyWrites(): LedgerProblem {
  return new LedgerProblem(
    'bad-draft',
    'The book was opened without a person, so nothing can be entered. Say who keeps it.',
  );
}

/** A draft names something that is not there, or contradicts what it names. */
export function badDraft(type: string, what: string): LedgerProblem {
  return new LedgerProblem('bad-draft', `A ${type} cannot be entered: ${what}. Nothing was written.`);
}

// The ledger

export function notCanonical(place: string, expected: string, found: string): LedgerProblem {
  return new LedgerProblem('not-canonical', `${place}: expected ${expected}, got ${found}.`);
}

export function notJson(place: string, cause: unknown): LedgerProblem {
  return new LedgerProblem(
    'not-canonical',
    `${place}: expected JSON, got something else (${reasonOf(cause)}).`,
    {},
    { cause },
  );
}

/** The ledger is not what was written. */
export function ledgerDamaged(file: string, line: number | undefined, what: string): LedgerProblem {
  const place = line === undefined ? { file } : { file, line };
  return new LedgerProblem(
    'ledger-damaged',
    `${file}${line === undefined ? '' : `:${line}`}: ${what}. ` +
      'Audit the book, and take the ledger from a copy; nothing was changed.',
    place,
  );
}

// The store

export function storeMissing(file: string): LedgerProblem {
  return new LedgerProblem(
    'store-missing',
    `${file}: the store has no such file. Run the recipe again, or take the file from a copy of the book.`,
    { file },
  );
}

export function storeDamaged(file: string, digest: string): LedgerProblem {
  return new LedgerProblem(
    'store-damaged',
    `${file}: expected bytes of the digest in its name, got ${digest}. Audit the book; remove the file and run the recipe again.`,
    { file },
  );
}

export function notADigest(text: string): LedgerProblem {
  return new LedgerProblem(
    'bad-call',
    `Expected a digest, 64 hexadecimal digits in lower case, got ${JSON.stringify(text)}.`,
  );
}

// Keys, seals and proofs

/** A key that signs cannot be used. */
export function badKey(file: string, expected: string, found: string, cause?: unknown): LedgerProblem {
  const advice = found.startsWith('mode ')
    ? `Set it with: chmod 600 ${file}`
    : 'Name the right file, in PLATEBOOK_KEY or with --key.';
  return new LedgerProblem(
    'bad-key',
    `${file}: expected ${expected}, got ${found.replace(/\.$/, '')}. ${advice}`,
    { file },
    { cause },
  );
}

/** The environment has neither a configuration directory nor a home. */
export function noPlaceForKey(): LedgerProblem {
  return new LedgerProblem(
    'bad-key',
    'The key that signs seals: expected PLATEBOOK_KEY, XDG_CONFIG_HOME or HOME in the environment, got none of them. ' +
      'Name the file in PLATEBOOK_KEY.',
  );
}

/** A signed note, a signature or a verifier key is not what it must be. */
export function badNote(place: string, expected: string): LedgerProblem {
  return new LedgerProblem('bad-note', `${place}: expected ${expected}.`);
}

/** Nothing can be shown to stand under a seal. */
export function noProof(what: string, advice: string): LedgerProblem {
  return new LedgerProblem('no-proof', `${what}. ${advice}`);
}

// Files outside

export function fileUnreadable(file: string, cause: unknown): LedgerProblem {
  return new LedgerProblem(
    'file-unreadable',
    `${file}: cannot be read (${reasonOf(cause)}). Check the path and the permissions.`,
    { file },
    { cause },
  );
}

/** A file changed while its digest was taken. */
export function fileChanged(file: string): LedgerProblem {
  return new LedgerProblem(
    'file-changed',
    `${file}: changed while it was read. Wait until whatever writes it has finished, then repeat.`,
    { file },
  );
}

// Questions

export function badTime(text: string, expected: string): LedgerProblem {
  return new LedgerProblem('bad-call', `${JSON.stringify(text)}: expected ${expected} (RFC 3339).`);
}

export function badCall(message: string): LedgerProblem {
  return new LedgerProblem('bad-call', message);
}

/** Nothing of that name, number or digest. */
export function notFound(what: string, advice: string): LedgerProblem {
  return new LedgerProblem('not-found', `${what}. ${advice}`);
}

export function ambiguous(what: string, candidates: readonly string[]): LedgerProblem {
  const some = candidates.slice(0, 5).join(', ') + (candidates.length > 5 ? ', …' : '');
  return new LedgerProblem('ambiguous', `${what} can be any of ${some}. Give more of it.`);
}

/** An error of the system, or of the index's database, as a problem of the book; any other error as it is. */
export function asProblem(error: unknown, directory: string, isWriting: boolean): unknown {
  if (!(error instanceof Error) || error instanceof LedgerProblem) return error;
  const { syscall, path, errcode } = error as NodeJS.ErrnoException & { errcode?: number };
  if (syscall === undefined && errcode === undefined) return error;
  return isWriting ? cannotWrite(path ?? directory, error) : bookUnreadable(path ?? directory, error);
}

/** Why the system refused, in words. */
export function reasonOf(cause: unknown): string {
  if (!(cause instanceof Error)) return String(cause);
  const { code, errcode } = cause as NodeJS.ErrnoException & { errcode?: number };
  const primary = errcode === undefined ? undefined : SQLITE_REASONS[errcode & 0xff];
  return REASONS[code ?? ''] ?? primary ?? cause.message;
}

/** Primary result codes of SQLite: PERM, READONLY, IOERR, FULL, CANTOPEN. */
const SQLITE_REASONS: Readonly<Record<number, string>> = {
  3: 'permission denied',
  8: 'it is read-only',
  10: 'the disk reports an error, or is full',
  13: 'no space left on the disk',
  14: 'it cannot be opened',
};

const REASONS: Readonly<Record<string, string>> = {
  ENOENT: 'no such file',
  EACCES: 'permission denied',
  EPERM: 'not permitted',
  EISDIR: 'it is a directory',
  ENOTDIR: 'a part of the path is no directory',
  ENAMETOOLONG: 'the name is too long',
  ELOOP: 'links lead in a circle',
  EXDEV: 'it lies in another file system',
  ENOSPC: 'no space left on the disk',
  EDQUOT: 'the disk quota is used up',
  EFBIG: 'the file would be too large',
  EROFS: 'the file system is read-only',
  EMFILE: 'too many files are open',
  ENFILE: 'too many files are open on this machine',
  EAGAIN: 'no further process can be started',
  EIO: 'the disk reports an error',
};
