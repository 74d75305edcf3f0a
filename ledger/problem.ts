/** Errors of the book, each text built once. */

export type LedgerCode =
  | 'no-book'
  | 'book-unreadable'
  | 'ledger-damaged'
  | 'store-missing'
  | 'store-damaged'
  | 'not-found'
  | 'ambiguous'
  | 'cannot-write'
  | 'not-canonical';

export class LedgerProblem extends Error {
  override readonly name = 'LedgerProblem';
  readonly code: LedgerCode;
  readonly file: string | null;
  readonly line: number | null;

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
  }
}
