/** How a problem reaches the user: one text, one JSON document, one exit status. No stack trace ever does. */

import { LedgerProblem, reasonOf } from '../ledger/problem.ts';
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
    const said = `${reasonOf(error).replace(/\.$/, '')} (${system.code})`;
    return described('system', `${where}: ${said}. ${ADVICE[system.code] ?? OTHER_ADVICE}`, 1);
  }
  const text = error instanceof Error ? error.message : String(error);
  return described('internal', `An error of Platebook's own: ${text}. Please report it with the command.`, 1);
}

const OTHER_ADVICE = 'Check the place and its permissions.';
const ADVICE: Readonly<Record<string, string>> = {
  ENOSPC: 'Make room, and repeat: what is finished is carried forward.',
  EDQUOT: 'Make room, and repeat: what is finished is carried forward.',
  EROFS: 'Name a place that can be written.',
  EMFILE: 'Allow more open files (`ulimit -n`), and repeat: what is finished is carried forward.',
  ENFILE: 'Close other programs, and repeat: what is finished is carried forward.',
  EAGAIN: 'Allow more processes (`ulimit -u`), and repeat: what is finished is carried forward.',
};

function described(
  code: string,
  message: string,
  status: ExitStatus,
  place: { file?: string | null; line?: number | null; column?: number | null } = {},
): DescribedProblem {
  const { file = null, line = null, column = null } = place;
  return { text: message, document: { error: { code, message, file, line, column } }, status };
}
