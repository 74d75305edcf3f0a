/** How a problem reaches the user: one text, one JSON document, one exit status. No stack trace ever does. */

import { LedgerProblem } from '../ledger/problem.ts';
import { InputProblem } from '../stages/problem.ts';
import type { ExitStatus } from './command.ts';
import { RunnerProblem } from './problem.ts';

export interface DescribedProblem {
  readonly text: string;
  readonly document: {
    readonly error: {
      readonly code: string;
      readonly message: string;
      readonly file: string | null;
      readonly line: number | null;
      readonly column: number | null;
    };
  };
  readonly status: ExitStatus;
}

export function describeProblem(error: unknown): DescribedProblem {
  if (error instanceof RunnerProblem) {
    return described(error.code, error.message, error.exitStatus, error);
  }
  if (error instanceof LedgerProblem) return described(error.code, error.message, error.exitStatus, error);
  if (error instanceof InputProblem) return described(error.code, error.message, 2);
  const system = error as NodeJS.ErrnoException;
  if (typeof system?.code === 'string' && typeof system.syscall === 'string') {
    const where = system.path ?? system.syscall;
    return described(
      'system',
      `${where}: the system answered ${system.code}. Check the place and its permissions.`,
      1,
    );
  }
  const text = error instanceof Error ? error.message : String(error);
  return described('internal', `An error of Platebook's own: ${text}. Please report it with the command.`, 1);
}

function described(
  code: string,
  message: string,
  status: ExitStatus,
  place: { file?: string | null; line?: number | null; column?: number | null } = {},
): DescribedProblem {
  const { file = null, line = null, column = null } = place;
  return { text: message, document: { error: { code, message, file, line, column } }, status };
}
