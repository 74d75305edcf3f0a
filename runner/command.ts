/** What every command of the command line is handed. Commands are plain functions: words and options in, exit status
 *  out; only bin/ touches the process. */

export interface Io {
  out(text: string): void;
  err(text: string): void;
  /** The stream behind `err`, for drawing on a terminal. */
  readonly errorStream: NodeJS.WritableStream & { readonly columns?: number };
  readonly cwd: string;
  readonly env: Readonly<Record<string, string | undefined>>;
  /** Whether standard error is a terminal of so many columns. */
  readonly terminal: boolean;
  readonly columns: number;
}

/** 0 done and good; 1 the work ended badly; 2 the call or the recipe is wrong, nothing was started. */
export type ExitStatus = 0 | 1 | 2;

/** Options that every command takes. */
export interface CommonOptions {
  /** Absolute path of the book's directory. */
  readonly book: string;
  /** Print one JSON document on standard output and nothing else there. */
  readonly json: boolean;
  readonly quiet: boolean;
}
