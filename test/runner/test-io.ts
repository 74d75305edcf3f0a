/** The command line in memory: what it prints, and its exit status. */

import { PassThrough } from 'node:stream';
import type { Io } from '../../runner/command.ts';
import { main } from '../../runner/main.ts';

export interface Said {
  readonly status: number;
  readonly out: string;
  readonly err: string;
}

/** Runs the command line with these words in a folder. @param heard  is told what goes to standard error */
export async function platebook(
  cwd: string,
  words: readonly string[],
  heard: (text: string) => void = () => {},
): Promise<Said> {
  let out = '';
  let err = '';
  const io: Io = {
    out: (text) => {
      out += text;
    },
    err: (text) => {
      err += text;
      heard(text);
    },
    errorStream: new PassThrough(),
    cwd,
    env: { PLATEBOOK_BY: 'A. Tester', PLATEBOOK_KEY: process.env.PLATEBOOK_KEY ?? '' },
    terminal: false,
    columns: 100,
  };
  const status = await main(words, io, new AbortController().signal);
  return { status, out, err };
}

/** The JSON document that a command printed. */
export async function document(cwd: string, words: readonly string[]) {
  const { out } = await platebook(cwd, [...words, '--json']);
  return JSON.parse(out);
}
