/** What the runner hands to a stage's process and what it gets back. */

import type { StageReport } from '../stages/kind.ts';

export interface Assignment {
  /** The module that declares the kind. */
  readonly kindFile: string;
  readonly kind: string;
  readonly parameters: Readonly<Record<string, unknown>>;
  /** Files by input name, in the order of the recipe. */
  readonly inputs: Readonly<Record<string, readonly string[]>>;
  /** Files to be made, by output name. */
  readonly outputs: Readonly<Record<string, string>>;
  readonly reportFile: string;
  readonly logFile: string;
}

/** Exit status of a stage's process that stopped with a problem of its own, told in the report. */
export const stoppedStatus = 3;

/** The document in the report file. */
export type ProcessReport =
  | {
      readonly done: true;
      readonly report: StageReport;
      /** Bytes. */
      readonly peakMemory: number;
      readonly platform: string;
    }
  | {
      readonly done: false;
      readonly error: { readonly code: string; readonly message: string; readonly detail: string };
      readonly peakMemory: number;
      readonly platform: string;
    };
