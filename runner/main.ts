/** The command line. `main` is a function of words and an Io; only `runProcess` touches the process. */

import { CommanderError } from 'commander';
import type { ExitStatus, Io } from './command.ts';
import { makeProgram } from './command-line.ts';
import { describeProblem } from './describe-problem.ts';

/** Runs one command. Every problem is printed, none is thrown.
 *  @param words   the command line without node and program
 *  @param signal  aborted when the user interrupts */
export async function main(words: readonly string[], io: Io, signal: AbortSignal): Promise<ExitStatus> {
  let status: ExitStatus = 0;
  const program = makeProgram(io, signal, (ended) => {
    status = ended;
  });
  try {
    await program.parseAsync([...words], { from: 'user' });
    return status;
  } catch (error) {
    if (error instanceof CommanderError) return error.exitCode === 0 ? 0 : 2;
    const described = describeProblem(error);
    if (words.includes('--json')) io.out(`${JSON.stringify(described.document, null, 2)}\n`);
    else io.err(`${described.text}\n`);
    return described.status;
  }
}

/** Runs the command line of a process and sets its exit status. Ctrl-C asks the command to stop; a second one leaves
 *  at once. */
export async function runProcess(target: NodeJS.Process): Promise<void> {
  const interruption = new AbortController();
  let asked = 0;
  const interrupt = () => {
    asked += 1;
    if (asked === 1) interruption.abort();
    else target.exit(1);
  };
  target.on('SIGINT', interrupt);
  target.on('SIGTERM', interrupt);
  const io: Io = {
    out: (text) => target.stdout.write(text),
    err: (text) => target.stderr.write(text),
    errorStream: target.stderr,
    cwd: target.cwd(),
    env: target.env,
    terminal: target.stderr.isTTY === true,
    columns: target.stdout.columns ?? 100,
  };
  target.exitCode = await main(target.argv.slice(2), io, interruption.signal);
}
