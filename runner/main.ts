/** The command line. `main` is a function of words and an Io; only `runProcess` touches the process. */

import { writeSync } from 'node:fs';
import { CommanderError } from 'commander';
import { reasonOf } from '../ledger/problem.ts';
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
  let lost = false;
  for (const stream of [target.stdout, target.stderr]) {
    stream.on('error', (error: NodeJS.ErrnoException) => {
      // Where nobody reads on (`| head`) there is nothing left to say; the work goes on and ends as it would.
      if (error.code === 'EPIPE') return;
      const why = `standard output: cannot be written (${reasonOf(error)}). Mend the cause and repeat.\n`;
      if (!lost) sayLast(why);
      lost = true;
      target.exitCode ||= 1;
    });
  }
  // What nothing else has caught, such as a process that cannot be started: a sentence, never a stack.
  target.on('uncaughtException', (error) => {
    sayLast(`${describeProblem(error).text}\n`);
    target.exit(1);
  });
  const io: Io = {
    out: (text) => target.stdout.write(text),
    err: (text) => target.stderr.write(text),
    errorStream: target.stderr,
    cwd: target.cwd(),
    env: target.env,
    terminal: target.stderr.isTTY === true,
    columns: target.stdout.columns ?? 100,
  };
  const status = await main(target.argv.slice(2), io, interruption.signal);
  target.exitCode = lost && status === 0 ? 1 : status;
}

/** Says something when nothing else can be relied on. */
function sayLast(text: string): void {
  try {
    writeSync(2, text);
  } catch {
    // Standard error is what cannot be written to.
  }
}
