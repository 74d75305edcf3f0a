/** Entries of the ledger: what each type holds. An entry is one line of canonical JSON (RFC 8785) and never changes.
 *  Fields may be added to a type, none is renamed or given another meaning. */

export type Json = null | boolean | number | string | readonly Json[] | { readonly [key: string]: Json };

export interface Person {
  readonly name: string;
  readonly orcid?: string;
}

/** Fields that every entry has; the book fills them in. */
export interface EntryCommon {
  /** The book's name. */
  readonly book: string;
  /** 1, 2, 3 … */
  readonly number: number;
  /** SHA-256 of the line before, without its line feed; of nothing for the first entry. */
  readonly before: string;
  /** RFC 3339, UTC, exactly `YYYY-MM-DDThh:mm:ss.sssZ`. */
  readonly time: string;
  readonly by: Person;
}

export interface StoredFile {
  readonly digest: string;
  readonly bytes: number;
}

export type Origin =
  /** The path as the recipe gives it. */
  { readonly file: string } | { readonly entry: number; readonly output: string };

export interface RecordedInput extends StoredFile {
  readonly origin: Origin;
}

export interface RecordedCode {
  /** SHA-256 over the import closure's files, the third-party versions and the runtime release. */
  readonly digest: string;
  readonly version: number;
  /** Path below the program's root to digest. */
  readonly files: { readonly [path: string]: string };
  /** Package to version, from the lock file. */
  readonly packages: { readonly [name: string]: string };
  readonly runtime: string;
  /** package.json. Where it stands, it and every file of `files` are kept in the store under their digests. */
  readonly package?: StoredFile;
  /** The lock file; absent when the program was installed without one. */
  readonly lock?: StoredFile;
}

export interface RecordedFinding {
  readonly check: string;
  readonly finding: 'within limits' | 'marginal' | 'out of limits';
  readonly value: number;
  readonly marginal: number;
  readonly limit: number;
  readonly detail: string;
}

/** What a stage entry and a failure share. */
export interface StageRecord {
  readonly name: string;
  readonly kind: string;
  readonly key: string;
  readonly code: RecordedCode;
  /** By input name; a list where the input takes many. */
  readonly inputs: { readonly [name: string]: readonly RecordedInput[] };
  /** Every parameter after defaults; a quantity as { value, unit }. */
  readonly parameters: { readonly [name: string]: Json };
  readonly seed: number | null;
  readonly seconds: number;
  /** Bytes. */
  readonly peakMemory: number;
  /** Digest of the log. */
  readonly log: StoredFile | null;
  readonly platform: string;
}

export interface StageDraft extends StageRecord {
  readonly type: 'stage';
  readonly outputs: { readonly [name: string]: StoredFile & { readonly format: string } };
  readonly findings: readonly RecordedFinding[];
  readonly warnings: readonly string[];
  readonly stop: string | null;
  readonly mark: string | null;
}

export interface FailureDraft extends StageRecord {
  readonly type: 'failure';
  readonly error: { readonly code: string; readonly message: string };
}

export type StageState = 'computed' | 'carried forward' | 'failed' | 'not reached';

export interface PublishedNumber {
  readonly name: string;
  readonly value: number;
  readonly low: number | null;
  readonly high: number | null;
  readonly unit: string;
  /** The entry whose output holds the number, and where in it. */
  readonly entry: number;
  readonly output: string;
  readonly key: string;
  /** The truth of synthetic data, where the recipe names one. */
  readonly against: { readonly value: number; readonly unit: string; readonly entry: number } | null;
  /** In the number's unit; null when the recipe states none. */
  readonly tolerance: number | null;
}

export interface RunDraft {
  readonly type: 'run';
  readonly recipe: StoredFile & { readonly name: string; readonly path: string };
  /** `--let` as given, in order. */
  readonly overrides: readonly {
    readonly stage: string;
    readonly parameter: string;
    readonly text: string;
  }[];
  readonly stages: readonly {
    readonly stage: string;
    readonly kind: string;
    readonly state: StageState;
    readonly entry: number | null;
  }[];
  readonly plates: readonly { readonly name: string; readonly plate: string; readonly entry: number }[];
  readonly numbers: readonly PublishedNumber[];
  readonly finished: boolean;
}

export interface PlateDraft {
  readonly type: 'plate';
  /** Such as `57b-K3Q9M2`. */
  readonly plate: string;
  readonly name: string;
  /** The entry that drew the figure, and its output. */
  readonly drawn: number;
  readonly output: string;
  /** Digest of the figure without number. */
  readonly figure: string;
  readonly stamped: { readonly svg: StoredFile; readonly png: StoredFile };
  readonly mark: string | null;
}

export type Verdict = 'identical' | 'within tolerance' | 'different';

export interface RerunDraft {
  readonly type: 'rerun';
  /** The run entry or stage entry that was executed again. */
  readonly of: number;
  readonly verdict: Verdict;
  readonly outputs: readonly {
    readonly stage: string;
    readonly output: string;
    readonly verdict: Verdict;
    readonly was: string;
    readonly is: string | null;
    /** Relative to the published number's own scale; null where nothing could be compared. */
    readonly largestDeviation: number | null;
  }[];
  /** What differs from the record in code or runtime, in sentences; empty when nothing does. */
  readonly differences: readonly string[];
}

/** A file that an imported entry names and the bag held; now in this book's store. */
export interface ImportedFile extends StoredFile {
  /** What it is to the imported entry: a role of references.ts, or `code`. */
  readonly role: string;
  readonly name: string;
}

/** An entry of another book, taken over from a bag as it stood there. */
export interface ImportDraft {
  readonly type: 'import';
  /** The book that it comes from, its number there, and the digest of its line. */
  readonly origin: { readonly book: string; readonly number: number; readonly digest: string };
  /** Type and name of the imported entry, and who wrote it. */
  readonly imported: { readonly type: string; readonly name: string; readonly by: Person };
  /** Its line, without line feed; the digest is the origin's. */
  readonly record: StoredFile;
  /** The document that proves it to be under a seal of its book; null when the bag had none. */
  readonly proof: StoredFile | null;
  readonly files: readonly ImportedFile[];
  /** Entries of this book that stand for those which the imported entry depends on, and their numbers there. */
  readonly entries: readonly { readonly number: number; readonly entry: number }[];
}

/** An entry that does not stand any more: nothing that depends on it is carried forward, and every question says so.
 *  A withdrawal may itself be withdrawn; then it counts no more. */
export interface WithdrawalDraft {
  readonly type: 'withdrawal';
  readonly withdraws: number;
  readonly reason: string;
}

/** A signature, with a key of one's own, under an entry or under a seal. */
export interface CountersignatureDraft {
  readonly type: 'countersignature';
  /** The entry that is signed; of a seal the last entry under it. */
  readonly signs: number;
  /** The digest of that entry, or the seal's text without signatures. See countersignature.ts for what is signed. */
  readonly what: string;
  /** The verifier key: `name+hash+base64`. */
  readonly key: string;
  /** Base64. */
  readonly signature: string;
}

export type Draft =
  | StageDraft
  | FailureDraft
  | RunDraft
  | PlateDraft
  | RerunDraft
  | ImportDraft
  | WithdrawalDraft
  | CountersignatureDraft;

export type StageEntry = StageDraft & EntryCommon;
export type FailureEntry = FailureDraft & EntryCommon;
/** `run` is the run's number within its book: 1, 2, 3 … */
export type RunEntry = RunDraft & EntryCommon & { readonly run: number };
export type PlateEntry = PlateDraft & EntryCommon;
export type RerunEntry = RerunDraft & EntryCommon;
export type ImportEntry = ImportDraft & EntryCommon;
export type WithdrawalEntry = WithdrawalDraft & EntryCommon;
export type CountersignatureEntry = CountersignatureDraft & EntryCommon;
export type Entry =
  | StageEntry
  | FailureEntry
  | RunEntry
  | PlateEntry
  | RerunEntry
  | ImportEntry
  | WithdrawalEntry
  | CountersignatureEntry;
