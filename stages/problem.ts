/** Errors that a stage throws. An InputProblem is the user's to mend and is shown as it stands; an InternalError is
 *  a broken invariant of ours and names the function. */

export interface InputProblemFields {
  /** A short fixed word for programs; append-only, never reused. */
  readonly code: string;
  /** Where: input, table, row, column, byte offset, parameter. */
  readonly place: string;
  readonly expected: string;
  readonly found: string;
  /** What to do. One sentence. */
  readonly advice: string;
}

export class InputProblem extends Error {
  override readonly name = 'InputProblem';
  readonly code: string;
  readonly place: string;
  readonly expected: string;
  readonly found: string;
  readonly advice: string;

  constructor(fields: InputProblemFields, options?: ErrorOptions) {
    super(
      `${fields.place}: ${fields.code}: expected ${fields.expected}, got ${fields.found}. ${fields.advice}`,
      options,
    );
    this.code = fields.code;
    this.place = fields.place;
    this.expected = fields.expected;
    this.found = fields.found;
    this.advice = fields.advice;
  }
}

export class InternalError extends Error {
  override readonly name = 'InternalError';

  constructor(where: string, what: string) {
    super(`${where}: ${what}`);
  }
}
